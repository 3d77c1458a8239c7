"""Waveforms made from a spectrum and a curve."""

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.errors import FileError, RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.files.curve import Curve
from wavegen.sources.shaped import (
    LONGEST_SAMPLES,
    LevelPoint,
    Shaped,
    Window,
    flat_density,
    quantiles,
    read_density,
)

N = 40_000
POINTS = tuple(
    LevelPoint(probability_percent=q, level_db=level)
    for q, level in ((60, -1.0), (10, 3.4), (1, 5.9), (0.1, 7.2), (0.01, 7.9))
)


@pytest.fixture
def site(tmp_path: Path) -> Site:
    return Site(
        sample_rate_hz=Fraction(20_000_000),
        n_samples=N,
        seed=3,
        label="signal",
        path="signal",
        folder=tmp_path,
    )


def gaussian() -> Curve:
    level = np.arange(-30, 12, 0.05)
    return Curve(level_db=level, probability=np.exp(-(10 ** (level / 10))), n_samples=None)


def test_levels_of_points_are_kept(site):
    signal = Shaped(points=POINTS, bandwidth_hz=Fraction(5_000_000)).build(site)
    power = np.sort(np.abs(samples_of(signal).astype(np.complex128)) ** 2)
    power /= power.mean()
    for point in POINTS[:-1]:
        k = int(N * (1 - point.probability_percent / 100))
        assert 10 * np.log10(power[k]) == pytest.approx(point.level_db, abs=0.06)
    assert [note.kind for note in site.notes] == ["info"]


def test_the_spectrum_is_flat_and_nothing_lies_outside(site):
    signal = Shaped(points=POINTS, bandwidth_hz=Fraction(5_000_000)).build(site)
    spectrum = np.abs(np.fft.fft(samples_of(signal))) ** 2
    place = np.fft.fftfreq(N) * 20e6
    inside = spectrum[np.abs(place) < 2.37e6]
    assert np.ptp(inside) / inside.mean() < 1e-3
    assert spectrum[np.abs(place) > 2.63e6].sum() / spectrum.sum() < 1e-11


def test_quantiles_of_a_full_curve_follow_it():
    envelopes, moved_db = quantiles(gaussian(), 100_000)
    assert abs(moved_db) < 0.002
    power = envelopes**2
    for q in (0.5, 0.1, 0.01, 0.001):
        assert power[int(100_000 * (1 - q))] == pytest.approx(-np.log(q), rel=2e-3)


def test_a_curve_that_begins_late_is_completed_to_its_own_mean():
    level = np.arange(0, 11, 0.05)
    late = Curve(level_db=level, probability=np.exp(-(10 ** (level / 10))), n_samples=None)
    _, moved_db = quantiles(late, 100_000)
    assert abs(moved_db) < 0.002


def test_a_curve_over_another_mean_is_told_of(site):
    moved = tuple(replace(point, level_db=point.level_db + 6) for point in POINTS)
    Shaped(points=moved, bandwidth_hz=Fraction(5_000_000)).build(site)
    assert any("not over its own mean" in note.text for note in site.notes)


def test_what_cannot_be_is_said(site):
    steady = (
        LevelPoint(probability_percent=99, level_db=-0.01),
        LevelPoint(probability_percent=1, level_db=0.01),
    )
    Shaped(points=steady, bandwidth_hz=Fraction(5_000_000)).build(site)
    (note,) = [note for note in site.notes if note.kind == "warning"]
    assert "was not found" in note.text
    assert "dBc outside" in note.text


def test_files_of_curve_and_spectrum(site, tmp_path):
    curve = gaussian()
    rows = "\n".join(f"{a},{b}" for a, b in zip(curve.level_db, curve.probability, strict=True))
    (tmp_path / "field.csv").write_text(f"level_db,ccdf\n{rows}\n")
    (tmp_path / "psd.csv").write_text("frequency_hz,density_db\n-2e6,-10\n0,0\n1e6,0\n1.1e6,-200\n")
    signal = Shaped(curve="field.csv", spectrum="psd.csv").build(site)
    spectrum = np.abs(np.fft.fft(samples_of(signal))) ** 2
    place = np.fft.fftfreq(N) * 20e6
    top = spectrum[(place > 0) & (place < 0.9e6)].mean()
    low = spectrum[np.abs(place + 1e6) < 1e4].mean()
    assert 10 * np.log10(low / top) == pytest.approx(-5, abs=0.1)
    assert spectrum[(place > 1.11e6) | (place < -2.01e6)].sum() / spectrum.sum() < 1e-11


@pytest.mark.parametrize(
    ("settings", "key"),
    [
        ({}, "curve"),
        ({"curve": "a.csv"}, "spectrum"),
        ({"curve": "a.csv", "points": POINTS, "spectrum": "b.csv"}, "points"),
        ({"curve": "a.csv", "spectrum": "b.csv", "bandwidth_hz": Fraction(1)}, "bandwidth"),
        ({"points": POINTS[:1], "spectrum": "b.csv"}, "points"),
        ({"points": POINTS[::-1], "spectrum": "b.csv"}, "points[1]"),
    ],
)
def test_settings_that_contradict(settings, key):
    with pytest.raises(QuantityError) as caught:
        Shaped(**settings)
    assert caught.value.key == key


@pytest.mark.parametrize(
    ("settings", "key"),
    [
        ({"points": POINTS, "bandwidth_hz": Fraction(20_000_000)}, "signal.bandwidth"),
        ({"points": POINTS, "spectrum": "none.csv"}, "signal.spectrum"),
        ({"curve": "none.csv", "bandwidth_hz": Fraction(5_000_000)}, "signal.curve"),
    ],
)
def test_what_cannot_be_built_is_told_at_its_key(site, settings, key):
    with pytest.raises(RecipeError) as caught:
        Shaped(**settings).build(site)
    assert caught.value.where == key


def test_a_loop_too_long_to_be_transformed(site):
    long = replace(site, n_samples=LONGEST_SAMPLES + 1)
    with pytest.raises(RecipeError, match="too long"):
        Shaped(points=POINTS, bandwidth_hz=Fraction(5_000_000)).build(long)


def test_flat_density_is_half_at_its_width():
    density = flat_density(np.array([0.0, 0.5, 0.45, 0.55, 0.6]), 1.0, 0.1)
    assert density == pytest.approx([1, 0.5, 1, 0, 0], abs=1e-12)
    assert flat_density(np.array([0.5, 0.51]), 1.0, 0.0).tolist() == [1, 0]


def test_a_spectrum_must_rise_in_frequency(tmp_path):
    path = tmp_path / "psd.csv"
    path.write_text("frequency_hz,density_db\n2,0\n1,0\n")
    with pytest.raises(FileError):
        read_density(path, np.array([0.0]))


def test_what_a_gate_keeps_follows_the_curve(site):
    window = Window(period_samples=8_000, first_samples=50, stop_samples=2_050)
    settings = Shaped(points=POINTS, bandwidth_hz=Fraction(5_000_000), within=window)
    assert settings.cycle(site.sample_rate_hz, "signal").n_samples == 8_000
    samples = samples_of(settings.build(site)).reshape(-1, 8_000)[:, 50:2_050]
    power = np.sort(np.abs(samples.astype(np.complex128)).ravel() ** 2)
    power /= power.mean()
    for point in POINTS[:-2]:
        k = int(power.size * (1 - point.probability_percent / 100))
        assert 10 * np.log10(power[k]) == pytest.approx(point.level_db, abs=0.06)


def test_a_window_that_is_none_is_refused():
    with pytest.raises(QuantityError):
        Window(period_samples=10, first_samples=5, stop_samples=5)
