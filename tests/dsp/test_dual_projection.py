"""The projection against its optimality conditions: nothing else is the optimum."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.optimize import minimize

from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.dual_projection import hold_below, momentum, project, project_rows
from wavegen.dsp.occupied_bands import Band, design_bands


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples in memory."""

    samples: NDArray[np.complex64]

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def rows_of(n_rows, n_fft, n_tones, seed=1):
    rng = np.random.default_rng(seed)
    bins = np.arange(-(n_tones // 2), n_tones - n_tones // 2)
    lines = np.zeros((n_rows, n_fft), np.complex128)
    lines[:, bins] = rng.normal(size=(n_rows, n_tones)) + 1j * rng.normal(size=(n_rows, n_tones))
    rows = np.fft.ifft(lines, axis=1)
    rows /= np.sqrt(np.mean(np.abs(rows) ** 2))
    response = np.zeros(n_fft, np.float32)
    response[bins] = 1
    return rows.astype(np.complex64), response


def test_rows_reach_the_optimum_that_a_general_solver_finds():
    """16 tones on 64 samples; the referee is a sequential quadratic programme on the tones."""
    rows, response = rows_of(1, 64, 16, seed=3)
    amplitude = 1.4
    got = project_rows(rows, response=response, amplitude=amplitude, n_rounds=600)[0]
    bins = np.flatnonzero(response)
    basis = np.exp(2j * np.pi * np.outer(np.arange(64), bins) / 64)
    start = rows[0].astype(np.complex128)

    def signal(z):
        return start + basis @ (z[:16] + 1j * z[16:])

    def room(z):
        return amplitude**2 - np.abs(signal(z)) ** 2

    def slope(z):
        turned = -2 * np.conj(signal(z))[:, None] * basis
        return np.concatenate([turned.real, -turned.imag], axis=1)

    found = minimize(
        lambda z: 0.5 * z @ z,
        np.zeros(32),
        jac=lambda z: z,
        constraints={"type": "ineq", "fun": room, "jac": slope},
        method="SLSQP",
        options={"maxiter": 500, "ftol": 1e-14},
    )
    assert found.success
    error = np.sum(np.abs(got - start) ** 2)
    best = np.sum(np.abs(signal(found.x) - start) ** 2)
    # 600 rounds leave 1e-3 of the error, less than 0.01 dB.
    assert 10 * np.log10(error / best) == pytest.approx(0, abs=0.01)
    assert np.max(np.abs(got)) < amplitude * 1.001


@pytest.mark.parametrize(("n_rounds", "over_db"), [(20, 0.35), (50, 0.06)])
def test_more_rounds_come_nearer_to_the_ceiling(n_rounds, over_db):
    rows, response = rows_of(8, 1024, 256)
    got = project_rows(rows, response=response, amplitude=2.0, n_rounds=n_rounds)
    assert 20 * np.log10(np.max(np.abs(got)) / 2.0) < over_db
    outside = np.fft.fft((got - rows).astype(np.complex128), axis=1)[:, response == 0]
    assert np.sum(np.abs(outside) ** 2) < 1e-12 * 1024 * np.sum(np.abs(rows) ** 2)


def test_what_keeps_the_ceiling_is_left():
    rows, response = rows_of(4, 256, 64)
    high = float(np.max(np.abs(rows))) * 1.001
    assert np.array_equal(project_rows(rows, response=response, amplitude=high, n_rounds=5), rows)


def test_momentum_grows():
    assert momentum(1) == [0.0]
    assert all(a < b < 1 for a, b in zip(momentum(50)[1:], momentum(50)[2:], strict=False))


@pytest.fixture(scope="module")
def loop():
    rows, _ = rows_of(1, 1 << 15, 1 << 13)
    return Held(sample_rate_hz=Fraction(1), n_samples=1 << 15, samples=rows[0])


BAND = BandFilter(design_bands((Band(-0.125, 0.125),), transition=0.02))


def test_a_stream_is_projected_as_a_row_is(loop):
    """One row, and the response that the filter has at the bins of the loop."""
    signal = project(loop, band=BAND, amplitude=1.9, n_rounds=12)
    lag = np.zeros(loop.n_samples)
    lag[np.arange(-BAND.half_length, BAND.half_length + 1)] = BAND.taps
    response = np.fft.fft(lag).real.astype(np.float32)
    row = project_rows(loop.samples[None, :], response=response, amplitude=1.9, n_rounds=12)
    assert np.max(np.abs(samples_of(signal) - row[0])) < 2e-5


def test_held_below_no_sample_passes(loop):
    signal = project(loop, band=BAND, amplitude=1.9, n_rounds=6)
    held = hold_below(
        signal, amplitude=1.9, gain=0.5, half_length=BAND.half_length, mean_power=None
    )
    before, after = samples_of(signal), samples_of(held)
    assert np.max(np.abs(before)) > 1.9 * 1.001
    assert np.max(np.abs(after)) <= 0.95 * (1 + 5e-7)
    change = np.fft.fft(2 * after.astype(np.complex128) - loop.samples)
    far = np.abs(np.fft.fftfreq(change.size)) > 0.125 + 0.02 + 0.02
    assert np.sum(np.abs(change[far]) ** 2) < 1e-10 * change.size * np.sum(
        np.abs(loop.samples) ** 2
    )
