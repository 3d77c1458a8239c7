import dataclasses
import pickle
from functools import cached_property

import pytest

from wavegen.core.signal import Signal


def test_defaults_describe_a_source_on_no_grid(lab):
    signal = Signal(sample_rate_hz=lab.rate_hz, n_samples=10)
    assert (signal.step, signal.inputs, signal.mean_power) == (1, (), 1.0)
    assert signal.needs(0, 10) == ()


def test_needs_is_the_same_range_of_each_input_unless_said(lab):
    source = lab.white(10)
    assert lab.multiplied(source, source).needs(2, 5) == ((2, 5), (2, 5))


def test_signals_are_frozen_and_compare_by_identity(lab):
    signal, twin = lab.white(10), lab.white(10)
    with pytest.raises(dataclasses.FrozenInstanceError):
        signal.n_samples = 11
    assert signal != twin
    assert len({signal, twin, signal}) == 2


def test_a_bare_description_names_itself_when_computed(lab):
    with pytest.raises(TypeError, match="Signal"):
        Signal(sample_rate_hz=lab.rate_hz, n_samples=10).compute(0, 10)


class Cached(Signal):
    """A signal with something worth keeping."""

    @cached_property
    def table(self):
        return bytes(10**6)


def test_what_was_cached_does_not_travel(lab):
    signal = Cached(sample_rate_hz=lab.rate_hz, n_samples=10)
    assert len(signal.table) == 10**6
    packed = pickle.dumps(signal)
    assert len(packed) < 1000
    again = pickle.loads(packed)  # noqa: S301 - our own bytes
    assert (again.sample_rate_hz, again.n_samples) == (lab.rate_hz, 10)
    assert "table" in vars(signal)
    assert "table" not in vars(again)


def test_a_signal_shows_itself_without_what_it_is_made_of(lab):
    signal = lab.white(10)
    for _ in range(30):
        signal = lab.multiplied(signal, signal)
    assert len(repr(signal)) < 1000  # not 2^30 sources
