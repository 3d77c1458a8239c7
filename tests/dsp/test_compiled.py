"""Loops that are compiled, and what happens where they cannot be."""

import sys

import numpy as np

from wavegen.dsp.compiled import compiled, numba_types


def double(values):
    for i in range(values.size):
        values[i] *= 2


def test_a_loop_runs_as_compiled():
    kinds = numba_types()
    made = compiled(kinds.void(kinds.Array(kinds.float64, 1, "C")), double)
    values = np.arange(4.0)
    made(values)
    assert values.tolist() == [0, 2, 4, 6]
    assert made.nopython_signatures


def test_without_numba_there_is_nothing(monkeypatch):
    monkeypatch.setitem(sys.modules, "numba", None)
    assert numba_types() is None


def test_numba_may_be_switched_off(monkeypatch):
    import numba

    monkeypatch.setattr(numba.config, "DISABLE_JIT", 1)
    assert numba_types() is None
