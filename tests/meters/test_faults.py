"""Each fault is put into a clean record and must be found; clean records have none."""

from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.meters.faults import check_record, code_scale
from wavegen.production.prepare import prepare
from wavegen.recipe.find import find_recipe, shipped_recipes
from wavegen.recipe.load import load_recipe
from wavegen.sources.noise import Noise

RECORDINGS = Path(__file__).parents[1] / "files" / "recordings"
N = 200_000


def kinds(check):
    return [fault.kind for fault in check.faults]


def codes(samples, rms=3000.0):
    """Round to 16 bits, clipped to what they hold; full scale 1."""
    scaled = samples * rms
    real = np.clip(np.rint(scaled.real), -32768, 32767)
    imag = np.clip(np.rint(scaled.imag), -32768, 32767)
    return ((real + 1j * imag) / 32768).astype(np.complex64)


@pytest.fixture
def noise(band_noise):
    return band_noise(21, N, 0.25)


class TestClean:
    @pytest.mark.parametrize("name", [name for name, _, _ in shipped_recipes()])
    def test_what_the_shipped_recipes_make(self, name):
        built = prepare(load_recipe(find_recipe(name), overrides=())).built.signal
        assert kinds(check_record(built, loops=False)) == []

    @pytest.mark.parametrize("fraction", [0.1, 0.25, 0.5, 0.95])
    def test_noise_of_any_width_in_16_bits(self, held, band_noise, fraction):
        for seed in range(3):
            signal = held(codes(band_noise(seed, N, fraction)))
            assert kinds(check_record(signal, code_scale=32768.0)) == []

    def test_a_tone_two_tones_and_a_carrier(self, held):
        index = np.arange(N)
        for samples in (
            np.exp(2j * np.pi * 0.0123 * index),
            np.exp(0.3j * index) + np.exp(-0.2j * index),
            np.ones(N),
        ):
            assert kinds(check_record(held(codes(samples, 14_000)), code_scale=32768.0)) == []

    def test_rectangular_symbols_with_an_offset_line(self, held):
        rng = np.random.default_rng(3)
        symbols = np.exp(0.25j * np.pi * (2 * rng.integers(0, 4, N // 8) + 1))
        signal = held(codes(np.repeat(symbols, 8), 20_000))
        assert kinds(check_record(signal, code_scale=32768.0)) == []

    def test_bursts_with_hard_edges(self, held, noise):
        is_on = np.arange(N) % 9000 < 5000
        signal = held(np.where(is_on, noise, 0))
        assert kinds(check_record(signal)) == []

    def test_one_burst_in_the_record(self, held, noise):
        is_on = np.arange(N) < N // 2
        assert kinds(check_record(held(np.where(is_on, noise, 0.001 * noise)))) == []


@pytest.mark.parametrize("n", [1, 2, 3, 63, 64, 65, 66, 130])
def test_records_too_short_to_tell_have_none(held, noise, n):
    for samples in (noise[1000 : 1000 + n], np.full(n, 0.25 + 0.5j)):
        check = check_record(held(codes(samples)), code_scale=32768.0)
        assert "dc_offset" not in kinds(check)
        assert check.n_codes >= 1


def test_dc_offset(held, noise):
    offset = 0.1 - 0.05j
    check = check_record(held(noise + np.complex64(offset)))
    assert kinds(check) == ["dc_offset"]
    # The mean of N samples of which N/4 are independent: 4 sigma.
    assert abs(check.offset - offset) < 4 / np.sqrt(N / 4)
    want_db = 10 * np.log10(abs(offset) ** 2)
    assert check.faults[0].size == pytest.approx(want_db, abs=0.8)
    assert check_record(held(noise + np.complex64(0.005))).faults == ()  # -46 dB: small


def test_gain_and_phase_imbalance(held, noise):
    phase = np.deg2rad(2.0)
    imag = noise.imag * np.cos(phase) + noise.real * np.sin(phase)
    check = check_record(held((noise.real * 10 ** (0.5 / 20) + 1j * imag).astype(np.complex64)))
    assert kinds(check) == ["iq_imbalance"]
    # Standard error of the ratio 1/sqrt(N/8) = 0.006: 0.06 dB and 0.36 deg, three of them.
    assert check.gain_imbalance_db == pytest.approx(0.5, abs=0.18)
    assert check.phase_imbalance_deg == pytest.approx(2.0, abs=1.1)


def test_clipping_at_full_scale(held, noise):
    check = check_record(held(codes(noise, 15_000)), code_scale=32768.0)
    assert set(kinds(check)) == {"clipped"}
    assert {fault.text for fault in check.faults} == {"samples at full scale"}
    high = next(fault for fault in check.faults if "I, highest" in fault.where)
    assert high.size == np.count_nonzero(np.rint(noise.real * np.float32(15_000)) >= 32767)


def test_clipping_below_full_scale(held, noise):
    for scale, make in ((32768.0, codes), (None, lambda x: x)):
        rails = np.clip(noise.real, -2, 2) + 1j * np.clip(noise.imag, -2, 2)
        check = check_record(held(make(rails)), code_scale=scale)
        assert set(kinds(check)) == {"clipped"}
        assert len(check.faults) == 4


def test_clipping_of_the_envelope_is_no_pile_up(held, noise):
    envelope = noise * np.minimum(1, 1.5 / np.maximum(np.abs(noise), 1e-9))
    assert kinds(check_record(held(codes(envelope)), code_scale=32768.0)) == []


def test_fill_words_and_start_up(held, noise):
    samples = codes(noise, 50)
    samples[:3] = -1 - 1j
    samples[3:20] = 0.05
    check = check_record(held(samples), code_scale=32768.0)
    assert kinds(check)[:2] == ["fill", "start_up"]
    fill, start_up = check.faults[:2]
    assert (fill.first_sample, fill.stop_sample) == (0, 3)
    assert (start_up.first_sample, start_up.stop_sample) == (3, 20)
    power = np.abs(samples.astype(np.complex128)) ** 2
    assert fill.size == pytest.approx(10 * np.log10(power.mean() / power[3:].mean()), abs=1e-6)
    assert "20samples" in fill.remedy


def test_fill_words_inside(held, noise):
    samples = codes(noise)
    samples[70_000:70_400] = -1 - 1j
    check = check_record(held(samples), code_scale=32768.0)
    fault = next(fault for fault in check.faults if fault.kind == "fill")
    assert (fault.size, fault.first_sample) == (400, 70_000)


def test_a_constant_start_and_an_early_end(held, noise):
    samples = noise.copy()
    samples[-1000:] = 0
    check = check_record(held(samples))
    assert kinds(check) == ["ends_early"]
    assert (check.faults[0].first_sample, check.faults[0].stop_sample) == (N - 1000, N)
    samples = noise.copy()
    samples[:300] = 0
    assert kinds(check_record(held(samples))) == ["constant_start"]


def test_samples_that_are_not_finite(held, noise):
    samples = noise.copy()
    samples[[500, 70_001]] = np.nan, np.inf
    check = check_record(held(samples))
    assert kinds(check) == ["not_finite"]
    assert (check.faults[0].size, check.faults[0].first_sample) == (2, 500)


def test_coarse_quantisation(held, noise):
    signal = held(codes(noise, 8.0))
    check = check_record(signal, code_scale=32768.0)
    assert kinds(check) == ["coarse_quantisation"]
    # Step^2 / 12 in each of two rails, over 8^2 in all.
    assert check.quantisation_db == pytest.approx(10 * np.log10(1 / 6 / 64), abs=0.05)
    left = (np.rint(noise.real * 8) + 1j * np.rint(noise.imag * 8)) * 16 / 32768
    again = check_record(held(left), code_scale=32768.0)
    assert again.quantisation_db == pytest.approx(check.quantisation_db, abs=0.01)


def test_rows_are_plain_values(held, noise):
    row = check_record(held(noise + np.complex64(1))).faults[0].row()
    assert set(row) == {
        "kind", "fault", "size", "unit", "where", "first_sample", "stop_sample", "effect", "remedy",
    }  # fmt: skip
    assert all(value is None or isinstance(value, str | int | float) for value in row.values())


def test_strips_and_workers_change_nothing(held, noise):
    samples = noise + np.complex64(0.2)
    samples[60_000:] = np.roll(samples[60_000:], 30_000)
    one = check_record(held(samples))
    assert check_record(held(samples), workers=3) == one
    assert one.faults


def test_a_noise_receiver_with_three_traps():
    # tests/files/recordings/README.md: sample 0 is a fill word, 1 to 17 are start-up, an offset
    # 17 dB over the noise, whose sigma is 3.45 codes.
    path = RECORDINGS / "rxnoise_440mhz_10ksps.ci16_le"
    recording = open_recording(path, ReadHints(sample_rate_hz=Fraction(10_000)))
    assert code_scale(recording) == 32768
    check = check_record(recording.signal, code_scale=32768.0)
    assert kinds(check) == ["fill", "start_up", "dc_offset", "coarse_quantisation"]
    fill, start_up, offset, coarse = check.faults
    assert (fill.size, start_up.size) == pytest.approx((22.5, 18), abs=0.05)
    assert offset.size == pytest.approx(17.0, abs=0.1)
    assert coarse.size == pytest.approx(10 * np.log10(1 / 12 / 3.45**2), abs=0.1)


@pytest.mark.parametrize(
    ("name", "rate_hz"),
    [
        ("wifi_11a_conducted_20msps.ci16_le", 20_000_000),
        ("nbiot_uplink_832mhz_640ksps_cut.sigmf-data", 640_000),
    ],
)
def test_good_recordings_have_none(name, rate_hz):
    hints = ReadHints(sample_rate_hz=None if "sigmf" in name else Fraction(rate_hz))
    check = check_record(open_recording(RECORDINGS / name, hints).signal, code_scale=32768.0)
    assert kinds(check) == []
    assert check.n_codes > 1000


def test_the_site_of_a_source_makes_no_fault():
    site = Site(sample_rate_hz=Fraction(10**6), n_samples=N, seed=1, label="a", path="signal")
    signal = Noise(bandwidth_hz=Fraction(10**6)).build(site)
    assert samples_of(signal).size == N
    assert check_record(signal, loops=True).faults == ()


@pytest.mark.parametrize(
    ("dtype", "name", "scale"),
    [("<i2", "ci16_le", 32768), ("i1", "ci8", 128), ("u1", "cu8", 255), ("<f4", "cf32_le", None)],
)
def test_codes_to_full_scale(tmp_path, dtype, name, scale):
    path = tmp_path / f"x.{name}"
    np.arange(1, 41).astype(dtype).tofile(path)
    hints = ReadHints(format=name, sample_rate_hz=Fraction(1000))
    assert code_scale(open_recording(path, hints)) == scale


def test_codes_to_another_full_scale(tmp_path):
    path = tmp_path / "x.ci16_le"
    np.arange(1, 41).astype("<i2").tofile(path)
    hints = ReadHints(format="ci16_le", sample_rate_hz=Fraction(1000), full_scale=2048.0)
    assert code_scale(open_recording(path, hints)) == 2048
