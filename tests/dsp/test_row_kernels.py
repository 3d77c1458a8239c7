"""Compiled passes against their NumPy twins, and both against plain arithmetic."""

import numpy as np
import pytest

from wavegen.dsp import row_kernels
from wavegen.dsp.row_kernels import (
    put_ahead,
    put_ahead_by_numpy,
    put_excess,
    put_excess_by_numpy,
    put_samples,
    scale_lines,
    scale_lines_by_numpy,
    take_difference,
    take_difference_by_numpy,
    take_excess,
    take_excess_by_numpy,
    take_samples,
)

N_FFT, HALF = 64, 9
HOP = N_FFT - 2 * HALF
AMPLITUDE = 1.3


def noise(n, seed):
    rng = np.random.default_rng(seed)
    made = rng.normal(size=2 * n).astype(np.float32).view(np.complex64)
    made[:3] = 0
    made.flags.writeable = False
    return made


def filled(put, *signals, n_rows=8, **numbers):
    rows = np.full((n_rows, N_FFT), np.nan, np.complex64)
    put(rows, *signals, hop=HOP, **numbers)
    return rows


def clipped(samples):
    return samples * np.minimum(1, AMPLITUDE / np.maximum(np.abs(samples), 1e-30))


# whole rows, one that is cut, several that have nothing, and nothing at all
SIZES = [7 * HOP + N_FFT, 7 * HOP + N_FFT + 5, 7 * HOP + 3, 4 * HOP, HALF, 0]


@pytest.mark.parametrize("size", SIZES)
def test_filling_rows(size):
    x, y = noise(size + 3, 1)[3:], noise(size + 3, 2)[3:]
    padded = np.concatenate([x, np.zeros(9 * N_FFT, np.complex64)])
    places = HOP * np.arange(8)[:, None] + np.arange(N_FFT)
    assert filled(put_samples, x).tobytes() == padded[places].tobytes()
    got = filled(put_excess, x, amplitude=AMPLITUDE)
    assert got.tobytes() == filled(put_excess_by_numpy, x, amplitude=AMPLITUDE).tobytes()
    assert np.max(np.abs(got - (padded - clipped(padded))[places])) < 1e-6  # 5 roundings of 1
    got = filled(put_ahead, x, y, factor=0.37)
    assert got.tobytes() == filled(put_ahead_by_numpy, x, y, factor=0.37).tobytes()
    want = padded + 0.37 * (padded - np.concatenate([y, np.zeros(9 * N_FFT)]))
    assert np.max(np.abs(got - want[places])) < 2e-6


@pytest.mark.parametrize("shape", [(1, N_FFT), (8, N_FFT)])
def test_lines_are_scaled(shape):
    response = np.random.default_rng(3).random(shape).astype(np.float32)
    lines = noise(8 * N_FFT, 4).reshape(8, N_FFT)
    got, want = lines.copy(), lines.copy()
    scale_lines(got, response)
    scale_lines_by_numpy(want, response)
    assert got.tobytes() == want.tobytes()
    assert np.array_equal(got, lines * response)


@pytest.mark.parametrize("size", [8 * HOP, 7 * HOP + 1, 3 * HOP - 1, 5])
def test_taking_rows(size):
    rows = noise(8 * N_FFT, 5).reshape(8, N_FFT).copy()
    x, y, before = (noise(size + 2, seed)[2:] for seed in (6, 7, 8))
    w = rows[:, HALF : HALF + HOP].reshape(-1)[:size]
    place = {"half": HALF, "hop": HOP}
    numbers = {**place, "factor": 0.6, "amplitude": AMPLITUDE}
    made = [np.full(size, np.nan, np.complex64) for _ in range(5)]
    take_samples(made[0], rows, **place)
    assert made[0].tobytes() == w.tobytes()
    take_difference(made[1], x, rows, gain=0.7, **place)
    take_difference_by_numpy(made[2], x, rows, gain=0.7, **place)
    assert made[1].tobytes() == made[2].tobytes()
    assert np.max(np.abs(made[1] - 0.7 * (x - w))) < 1e-6
    take_excess(made[3], x, y, before, rows, **numbers)
    take_excess_by_numpy(made[4], x, y, before, rows, **numbers)
    assert made[3].tobytes() == made[4].tobytes()
    v = x.astype(np.complex128) - w + y + 0.6 * (y - before)
    assert np.max(np.abs(made[3] - (v - clipped(v)))) < 3e-6


def test_without_a_compiler_the_twins_are_used(monkeypatch):
    monkeypatch.setattr(row_kernels, "_compile", lambda: None)
    x = noise(7 * HOP + N_FFT, 9)
    want = filled(put_excess_by_numpy, x, amplitude=AMPLITUDE)
    assert filled(put_excess, x, amplitude=AMPLITUDE).tobytes() == want.tobytes()
    assert filled(put_ahead, x, x, factor=0.0).tobytes() == filled(put_samples, x).tobytes()
    scale_lines(want, np.ones((1, N_FFT), np.float32))
    out = np.empty(8 * HOP, np.complex64)
    zero = np.zeros_like(out)
    take_excess(out, x, zero, zero, want, half=0, hop=HOP, factor=0, amplitude=100)
    assert not out.any()
    take_difference(out, x, want, half=0, hop=HOP)
    assert np.max(np.abs(out - clipped(x[: out.size]))) < 1e-6
