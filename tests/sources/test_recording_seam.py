"""What closing a loop does to levels and spectrum."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.held import Held
from wavegen.sources.recording_seam import counted, largest_change, spectrum_change

N = 1 << 16


def held(samples):
    samples = np.asarray(samples, np.complex64)
    return Held(
        sample_rate_hz=Fraction(10**6), n_samples=samples.size, samples=samples, mean_power=None
    )


@pytest.fixture
def noise():
    """Noise over a tenth of the rate that loops of itself."""
    rng = np.random.default_rng(4)
    spectrum = np.where(np.abs(np.fft.fftfreq(N)) < 0.05, 1, 0) * (
        rng.standard_normal(N) + 1j * rng.standard_normal(N)
    )
    x = np.fft.ifft(spectrum)
    return x / np.sqrt(np.mean(np.abs(x) ** 2))


def test_what_loops_of_itself_changes_by_the_segment_at_its_seam_alone(noise):
    found = spectrum_change(held(noise), held(noise))
    # 16 segments and one more, of a band of 410 bins in forty parts of ten: each part of one
    # segment scatters by a third, a seventeenth of which counts; largest of forty.
    assert found.largest_db < 4.34 * 3.5 / np.sqrt(10 / 1.7) / 16
    before, after = found.beside_dbc
    assert before < -90
    assert after < -90


def test_a_step_at_the_seam_is_seen_beside_the_band(noise):
    """Turned from end to end by a quarter of a turn, so that the seam jumps."""
    turned = noise * np.exp(0.5j * np.pi * np.arange(N) / N)
    before, after = spectrum_change(held(turned), held(turned)).beside_dbc
    assert before < -90
    assert after > -60


def test_a_tilt_within_the_band_is_seen(noise):
    tilted = noise.copy()
    tilted[: N // 2] *= np.exp(2j * np.pi * 0.01 * np.arange(N // 2))
    assert spectrum_change(held(noise), held(tilted)).largest_db > 1


def test_without_room_beside_the_band_nothing_is_said_of_it():
    rng = np.random.default_rng(1)
    white = held(rng.standard_normal(N) + 1j * rng.standard_normal(N))
    assert spectrum_change(white, white).beside_dbc is None


def test_a_loop_too_short_tells_nothing(noise):
    assert spectrum_change(held(noise[:500]), held(noise[:500])) is None


def test_levels_and_sums(noise):
    plain, mean, total = counted(held(noise))
    assert mean == pytest.approx(np.mean(np.abs(noise) ** 2), rel=1e-5)
    assert total == pytest.approx(noise.sum(), abs=0.5)
    assert largest_change(plain, plain) == (0.0, 0.1)
    louder = noise.copy()
    louder[: N // 50] *= 2  # 2 % of the time 6 dB higher: the level at 1 % moves most of all
    closed, _, _ = counted(held(louder))
    change_db, at = largest_change(plain, closed)
    assert at in {0.01, 1e-3, 1e-4}
    assert change_db > 1
