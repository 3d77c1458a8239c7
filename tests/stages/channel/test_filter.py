from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError, RecipeError
from wavegen.core.render import samples_of
from wavegen.core.units import QuantityError
from wavegen.recipe.dump import dump
from wavegen.recipe.load import load_text
from wavegen.stages.channel.filter import Filter, FilterTaps

HEAD = "wavegen: 1\nsample_rate: 1 MHz\nduration: 1 ms\nsignal: {kind: carrier}\nstages:\n  - "


def hz(**fields):
    return Filter(**{key: Fraction(x) if key.endswith("_hz") else x for key, x in fields.items()})


def with_taps(value):
    return Filter(taps=FilterTaps.parse(value))


def response_of(bench, settings, n=10_000):
    """Frequency response on the grid of a loop: what it makes of one impulse."""
    impulse = bench.given([1, *[0] * (n - 1)])
    got = samples_of(settings.build(bench.site(n), impulse)).astype(np.complex128)
    return np.fft.fft(got), np.fft.fftfreq(n, 1 / float(bench.rate_hz))


class TestBands:
    @pytest.mark.parametrize("stopband_db", [60.0, 100.0])
    def test_lowpass(self, bench, stopband_db):
        settings = hz(bandwidth_hz=200_000, transition_hz=20_000, stopband_db=stopband_db)
        response, frequency = response_of(bench, settings)
        away = np.abs(frequency)
        error = 10 ** (-stopband_db / 20) + 3e-7  # and rounding of float32
        assert np.abs(response[away <= 90_000] - 1).max() < error
        assert np.abs(response[away >= 110_000]).max() < error
        assert response[away == 100_000] == pytest.approx(0.5, abs=1e-3)

    def test_bandpass_is_one_sided_and_without_delay(self, bench):
        settings = hz(low_hz=-50_000, high_hz=150_000)  # edges 10 kHz wide
        response, frequency = response_of(bench, settings)
        inside = (frequency >= -45_000) & (frequency <= 145_000)
        outside = (frequency <= -55_000) | (frequency >= 155_000)
        assert np.abs(response[inside] - 1).max() < 1.1e-5
        assert np.abs(response[outside]).max() < 1.1e-5

    @pytest.mark.parametrize(
        ("fields", "key"),
        [
            ({"bandwidth_hz": 1_000_000}, "bandwidth"),
            ({"bandwidth_hz": 960_000}, "bandwidth"),
            ({"low_hz": -600_000, "high_hz": 0}, "low"),
            ({"low_hz": 0, "high_hz": 600_000}, "high"),
            ({"bandwidth_hz": 1000, "transition_hz": 1001}, "transition"),
            ({"bandwidth_hz": 1000, "transition_hz": 1}, "transition"),
            ({"bandwidth_hz": 20}, "bandwidth"),
        ],
    )
    def test_bands_that_cannot_be_made(self, bench, fields, key):
        with pytest.raises(RecipeError) as caught:
            hz(**fields).build(bench.site(100), bench.gaussian(100))
        assert caught.value.where == f"stages[0].{key}"

    @pytest.mark.parametrize("n_samples", [1, 3, 100])
    def test_loops_shorter_than_the_filter(self, bench, n_samples):
        settings = hz(bandwidth_hz=20_000)
        ones = bench.given([1], n_samples)
        assert samples_of(settings.build(bench.site(n_samples), ones)) == pytest.approx(1, abs=1e-5)


class TestTaps:
    @pytest.mark.parametrize("taps", [[0.5], [1, 2], [0, 0, -1j], [1 + 1j, 0.5, 0.25j, -2]])
    def test_as_given_first_tap_at_lag_zero(self, bench, taps):
        source = bench.gaussian(500)
        value = [[complex(tap).real, complex(tap).imag] for tap in taps]
        got = samples_of(with_taps(value).build(bench.site(500), source))
        x = samples_of(source)
        want = sum(tap * np.roll(x, lag) for lag, tap in enumerate(taps))
        assert np.abs(got - want).max() < 1e-5

    def test_one_is_no_stage(self, bench):
        source = bench.gaussian(50)
        assert with_taps([1]).build(bench.site(50), source) is source

    def test_from_a_file_beside_the_recipe(self, bench, tmp_path):
        (tmp_path / "if.txt").write_text("# made up\n0.5\n0.25, -1e-1 # second\n\n1 0.5\n")
        site = replace(bench.site(100), folder=tmp_path)
        source = bench.gaussian(100)
        got = samples_of(with_taps("if.txt").build(site, source))
        listed = with_taps([0.5, [0.25, -0.1], [1, 0.5]]).build(site, source)
        assert got.tobytes() == samples_of(listed).tobytes()

    @pytest.mark.parametrize("text", ["", "x\n", "1, 2, 3\n", "nan\n", "0\n0\n", "inf, 1\n"])
    def test_files_that_hold_no_taps(self, bench, tmp_path, text):
        (tmp_path / "bad.txt").write_text(text)
        site = replace(bench.site(100), folder=tmp_path)
        with pytest.raises(FileError) as caught:
            with_taps("bad.txt").build(site, bench.gaussian(100))
        assert caught.value.where.endswith("bad.txt")

    @pytest.mark.parametrize("name", ["none.txt", ".", "a\0b"])
    def test_files_that_are_not_there(self, bench, tmp_path, name):
        site = replace(bench.site(100), folder=tmp_path)
        with pytest.raises(FileError):
            with_taps(name).build(site, bench.gaussian(100))

    def test_a_huge_file_is_not_read(self, bench, tmp_path):
        (tmp_path / "huge.txt").write_bytes(b"1\n" * (1 << 22))
        site = replace(bench.site(100), folder=tmp_path)
        with pytest.raises(FileError, match="larger than 4 MB"):
            with_taps("huge.txt").build(site, bench.gaussian(100))

    @pytest.mark.parametrize(
        "value",
        ["", 1, None, {}, [], [0], [[0, 0]], ["x"], [True], [[1, 2, 3]], [[1]], [1e99], [10**400]],
    )
    def test_lists_that_hold_no_taps(self, value):
        with pytest.raises(QuantityError):
            FilterTaps.parse(value)


class TestMean:
    def test_the_change_is_told(self, bench):
        site = bench.site(4096)
        signal = with_taps([0.5]).build(site, bench.gaussian(4096))
        assert signal.mean_power is None
        (note,) = site.notes
        assert note.kind == "info"
        assert "-6.021 dB;" in note.text
        assert "the whole loop" in note.text

    def test_and_undone_if_asked(self, bench):
        site, source = bench.site(4096), bench.gaussian(4096, mean_power=3.0)
        settings = hz(bandwidth_hz=100_000, keep_mean=True)
        signal = settings.build(site, source)
        assert signal.mean_power == 3.0
        before, after = (np.mean(np.abs(samples_of(x)) ** 2) for x in (source, signal))
        assert after == pytest.approx(before, rel=1e-5)
        assert "undone" in site.notes[0].text

    def test_nothing_left_is_told(self, bench):
        site, carrier = bench.site(4000), bench.given([1], 4000)
        hz(low_hz=100_000, high_hz=200_000).build(site, carrier)
        assert site.notes[0].kind == "warning"
        for source in (carrier, bench.given([0], 4000)):
            with pytest.raises(RecipeError) as caught:
                hz(low_hz=100_000, high_hz=200_000, keep_mean=True).build(site, source)
            assert caught.value.where == "stages[0].keep_mean"


@pytest.mark.parametrize(
    ("fields", "key"),
    [
        ({}, ""),
        ({"low_hz": 1}, ""),
        ({"bandwidth_hz": 1, "low_hz": 0, "high_hz": 1}, ""),
        ({"bandwidth_hz": 1, "taps": FilterTaps.parse([1, 2])}, ""),
        ({"taps": FilterTaps.parse([1, 2]), "transition_hz": 1}, "transition"),
        ({"low_hz": 2, "high_hz": 2}, "high"),
    ],
)
def test_settings_that_say_nothing(fields, key):
    with pytest.raises(QuantityError) as caught:
        hz(**fields)
    assert caught.value.key == key


@pytest.mark.parametrize(
    "stage",
    [
        "{kind: filter, bandwidth: 5 kHz, transition: 500 Hz, stopband: 80 dB}",
        "{kind: filter, low: -2 kHz, high: 1/3 MHz, keep_mean: true}",
        "{kind: filter, taps: [0.25, 0.5, 0.25]}",
        "{kind: filter, taps: [[1, 0.5], 1e-9, -3]}",
        "{kind: filter, taps: filters/if.txt}",
    ],
)
def test_settings_come_back_from_yaml(stage):
    recipe = load_text(HEAD + stage + "\n").recipe
    assert load_text(dump(recipe)).recipe == recipe
    assert isinstance(recipe.stages[0], Filter)


@pytest.mark.parametrize("stopband", ["29 dB", "121 dB"])
def test_bounds(stopband):
    with pytest.raises(RecipeError) as caught:
        load_text(f"{HEAD}{{kind: filter, bandwidth: 1 kHz, stopband: {stopband}}}\n")
    assert "stopband" in str(caught.value)
