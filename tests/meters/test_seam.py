import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.dsp.bursts import raised_cosine_ramp
from wavegen.meters.seam import FLOOR_DBC, seam_figure


def symbols(seed, n_symbols, taps):
    """Symbols of 8 samples through a filter, as a loop."""
    rng = np.random.default_rng(seed)
    sparse = np.zeros(8 * n_symbols, np.complex128)
    sparse[::8] = rng.choice([1, 1j, -1, -1j], n_symbols)
    return np.fft.ifft(np.fft.fft(sparse) * np.fft.fft(taps, sparse.size))


@pytest.mark.parametrize("n", [1 << 17, 40_000, 5000, 1100])
def test_periodic_noise_is_clean_and_a_cut_record_is_not(held, band_noise, n):
    whole = seam_figure(held(band_noise(1, n, 0.25)))
    assert whole.is_tested
    assert whole.is_clean
    # Only the rounding of float32 samples is left out of band: 2^-24 each, near -150 dBc.
    assert whole.at_seam_dbc < -130
    assert whole.interior_dbc < -130
    cut = seam_figure(held(band_noise(1, 2 * n, 0.25)[:n]))
    assert cut.excess_db > 20
    assert not cut.is_clean
    assert cut.out_of_band.endswith("dB below the band")


def test_tone_that_misses_the_loop_by_a_hundredth_of_a_cycle(held):
    n = np.arange(30_000)
    assert seam_figure(held(np.exp(2j * np.pi * 50 * n / 30_000))).is_clean
    missed = seam_figure(held(np.exp(2j * np.pi * 50.01 * n / 30_000)))
    assert not missed.is_clean
    assert missed.excess_db > 60


def test_truncated_pulses_leave_the_same_everywhere(held):
    # Pulses of 12 symbols end abruptly: what they leave out of band is no fault of the seam.
    taps = np.hanning(96) ** 0.5 * np.sinc((np.arange(96) - 48) / 8)
    samples = symbols(2, 20_000, taps)
    found = seam_figure(held(samples), cycle_samples=8)
    assert found.n_same_place == 20
    assert found.interior_dbc > FLOOR_DBC
    assert found.is_clean
    assert not seam_figure(held(samples[:-4]), cycle_samples=8).is_clean


def test_full_band_noise_uses_the_quietest_tenth(held):
    rng = np.random.default_rng(3)
    for _ in range(5):
        samples = rng.standard_normal(100_000) + 1j * rng.standard_normal(100_000)
        found = seam_figure(held(samples))
        assert found.out_of_band == "quietest tenth"
        assert found.n_bins == pytest.approx(found.stretch_samples / 10, abs=2)
        # A tenth of white noise holds a tenth of its power.
        assert found.interior_dbc == pytest.approx(-10, abs=0.5)
        assert found.is_clean


def test_few_cycles_are_made_up_to_twenty(held, band_noise):
    found = seam_figure(held(band_noise(4, 1 << 17, 0.3)), cycle_samples=1 << 15)
    assert found.n_same_place == 3
    assert found.n_stretches == 20
    assert seam_figure(held(band_noise(4, 1 << 17, 0.3)), cycle_samples=1 << 17).n_same_place == 0


def test_a_loop_too_short_says_so(held):
    found = seam_figure(held(np.ones(64)))
    assert not found.is_tested
    assert found.n_stretches == 0
    assert found.excess_db == 0
    assert found.is_clean


def test_nothing_out_of_band_at_all(held):
    # Silence but for one sample far from the seam: the seam's stretch is empty.
    samples = np.zeros(100_000, np.complex64)
    samples[50_000:50_010] = 1
    found = seam_figure(held(samples))
    assert found.at_seam_dbc == -np.inf
    assert found.is_clean


def test_silence(held):
    with pytest.raises(SignalError) as caught:
        seam_figure(held(np.zeros(10_000)))
    assert caught.value.where == "seam"


def test_shorter_stretch_on_demand(held, band_noise):
    found = seam_figure(held(band_noise(5, 1 << 17, 0.3)), stretch_samples=5000)
    assert found.stretch_samples == 4096
    assert found.is_clean


def test_a_single_burst_that_begins_at_the_seam_is_no_break(held, band_noise):
    n, on = 15_360, 3_840
    ramp = raised_cosine_ramp(64)
    gate = np.zeros(n)
    gate[:on] = np.concatenate([ramp, np.ones(on - 128), ramp[::-1]])
    samples = band_noise(6, n, 0.25) * gate
    assert seam_figure(held(samples), cycle_samples=n).is_clean
    cut = np.roll(samples, -30)  # half of the ramp up is lost
    cut[-30:] = 0
    assert not seam_figure(held(cut), cycle_samples=n).is_clean
