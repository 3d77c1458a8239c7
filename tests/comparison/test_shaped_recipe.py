from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.comparison.curves import PointsCurve
from wavegen.comparison.shaped_recipe import RegularGate, curve_text, recipe_text, spectrum_text
from wavegen.comparison.spectra import side_spectrum
from wavegen.recipe.load import load_text
from wavegen.sources.shaped import read_density

PLAIN = {
    "name": "twin",
    "title": 'A "twin" of \\ more\nthan one line',
    "seed": 3,
    "bandwidth_hz": None,
    "rate_hz": Fraction(1_625_000, 6),
    "n_samples": 4096,
    "gate": None,
}


def rows(text):
    return np.array(
        [line.split(",") for line in text.splitlines() if line[:1].isdigit() or line[0] == "-"],
        np.float64,
    )


def test_a_recipe_says_exactly_what_it_is_of():
    recipe = load_text(recipe_text(**PLAIN), name="twin").recipe
    assert recipe.sample_rate_hz == Fraction(1_625_000, 6)
    assert recipe.seed == 3
    assert recipe.title == 'A "twin" of \\ morethan one line'
    assert (recipe.signal.curve, recipe.signal.spectrum) == ("twin.curve.csv", "twin.spectrum.csv")
    assert recipe.signal.bandwidth_hz is None
    assert not recipe.stages


def test_a_bandwidth_takes_the_place_of_a_spectrum_and_a_gate_has_its_window():
    gate = RegularGate(period_samples=1024, on_samples=300, ramp_samples=10)
    text = recipe_text(**PLAIN | {"bandwidth_hz": Fraction(100_000, 3), "gate": gate})
    recipe = load_text(text, name="twin").recipe
    assert recipe.signal.bandwidth_hz == Fraction(100_000, 3)
    assert recipe.signal.spectrum is None
    within = recipe.signal.within
    assert (within.period_samples, within.first_samples, within.stop_samples) == (1024, 10, 290)
    assert len(recipe.stages) == 1


def test_the_curve_of_samples_goes_down_to_the_rarest(side, noise):
    found = rows(curve_text(side(noise(1 << 12)), 1 << 14))
    assert (np.diff(found[:, 0]) > 0).all()
    assert (np.diff(found[:, 1]) < 0).all()
    assert found[0, 1] > 0.99
    assert found[-1, 1] == pytest.approx(1 / (1 << 12))


def test_points_stay_what_they_are(side, noise):
    points = PointsCurve(
        levels=np.array([-10.0, 0.0, 5.0, 9.0]), probabilities=np.array([1.0, 0.4, 0.05, 0.0])
    )
    text = curve_text(replace(side(noise(1 << 12)), curve=points, n_samples=777), 4096)
    assert text.startswith("# n_samples: 777\n")
    assert rows(text).tolist() == [[0.0, 0.4], [5.0, 0.05]]


def test_a_spectrum_is_read_back(side, noise, tmp_path):
    found = side_spectrum(side(noise(1 << 14)))
    path = tmp_path / "spectrum.csv"
    path.write_text(spectrum_text(found))
    place = found.spectrum.frequencies_hz
    density = read_density(path, place)
    expected = found.spectrum.density / found.spectrum.density.max()
    strong = expected > 1e-6
    assert density[strong] == pytest.approx(expected[strong], rel=1e-3)
