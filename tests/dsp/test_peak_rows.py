"""Compiled passes over peaks against their NumPy twins, and both against plain arithmetic."""

import numpy as np
import pytest

from wavegen.dsp import peak_rows
from wavegen.dsp.peak_rows import (
    put_lack,
    put_lack_by_numpy,
    put_peaks,
    put_peaks_by_numpy,
    take_lowered,
    take_lowered_by_numpy,
)

N_FFT, HALF = 64, 9
HOP = N_FFT - 2 * HALF
AMPLITUDE = 1.3


def noise(n, seed, *, is_coarse=False):
    rng = np.random.default_rng(seed)
    made = rng.normal(size=2 * n)
    if is_coarse:  # equal neighbours occur
        made = np.round(made)
    held = made.astype(np.float32).view(np.complex64)
    held.flags.writeable = False
    return held


def filled(put, samples, reach, n_rows=4):
    rows = np.full((n_rows, N_FFT), np.nan, np.complex64)
    put(rows, samples, hop=HOP, reach=reach, amplitude=AMPLITUDE)
    return rows


def padded(samples):
    return np.concatenate([samples, np.zeros(12 * N_FFT)]).astype(np.complex128)


@pytest.mark.parametrize("is_coarse", [False, True])
@pytest.mark.parametrize("reach", [1, 2, 7])
@pytest.mark.parametrize("size", [3 * HOP + N_FFT, 3 * HOP + 7, HOP, 0])
def test_peaks_stand_where_nothing_near_is_higher(size, reach, is_coarse):
    x = noise(size + 2 * reach, 1, is_coarse=is_coarse)
    got = filled(put_peaks, x, reach)
    assert got.tobytes() == filled(put_peaks_by_numpy, x, reach).tobytes()
    power = (x.real**2 + x.imag**2).astype(np.float32)
    want = np.zeros(12 * N_FFT, np.complex128)
    for k in range(size):
        near = power[k : k + 2 * reach + 1]
        here = near[reach]
        if here > np.float32(AMPLITUDE**2) and here == near.max() and here > max(near[:reach]):
            want[k] = x[k + reach] * (1 - AMPLITUDE / np.sqrt(float(here)))
    places = HOP * np.arange(4)[:, None] + np.arange(N_FFT)
    assert np.max(np.abs(got - want[places])) < 1e-6
    if size > HOP and not is_coarse:
        assert 3 < np.count_nonzero(got) < got.size / 2


@pytest.mark.parametrize("reach", [0, 1, 2, 3, 9])
@pytest.mark.parametrize("size", [7 * HOP + N_FFT, 6 * HOP + 7, HOP, 1, 0])
def test_two_stretches_of_what_neighbours_lack_stand_in_a_row(size, reach):
    x = noise(size + 2 * reach, 2)
    got = filled(put_lack, x, reach)
    assert got.tobytes() == filled(put_lack_by_numpy, x, reach).tobytes()
    short = np.maximum(1 - AMPLITUDE / np.maximum(np.abs(padded(x)), 1e-9), 0)
    windows = np.lib.stride_tricks.sliding_window_view(short, 2 * reach + 1).max(axis=1)
    windows[size:] = 0
    places = HOP * np.arange(8)[:, None] + np.arange(N_FFT)
    assert np.max(np.abs(got.real - windows[places][::2])) < 1e-6
    assert np.max(np.abs(got.imag - windows[places][1::2])) < 1e-6


@pytest.mark.parametrize("size", [8 * HOP, 7 * HOP + 1, 3 * HOP - 1, 5])
def test_lowering_takes_both_stretches(size):
    rows = noise(4 * N_FFT, 3).reshape(4, N_FFT).copy()
    x = noise(size + 2, 4)[2:]
    got, want = (np.full(size, np.nan, np.complex64) for _ in range(2))
    take_lowered(got, x, rows, half=HALF, hop=HOP, gain=0.7)
    take_lowered_by_numpy(want, x, rows, half=HALF, hop=HOP, gain=0.7)
    assert got.tobytes() == want.tobytes()
    inside = rows[:, HALF : HALF + HOP]
    lack = np.stack([inside.real, inside.imag], axis=1).reshape(-1)[:size]
    assert np.max(np.abs(got - 0.7 * x * (1 - lack))) < 1e-5


def test_without_a_compiler_the_twins_are_used(monkeypatch):
    monkeypatch.setattr(peak_rows, "_compile", lambda: None)
    x = noise(9 * HOP, 5)
    assert filled(put_peaks, x, 2).tobytes() == filled(put_peaks_by_numpy, x, 2).tobytes()
    rows = filled(put_lack, x, 2)
    assert rows.tobytes() == filled(put_lack_by_numpy, x, 2).tobytes()
    out = np.empty(3 * HOP, np.complex64)
    take_lowered(out, x, np.zeros_like(rows), half=HALF, hop=HOP, gain=1.0)
    assert np.array_equal(out, x[: out.size])
