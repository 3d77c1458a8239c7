import cmath

import numpy as np
import pytest

from wavegen.laws.composite import LinesTerm, LineTerm
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.hoyt import HoytLaw
from wavegen.laws.inversion import law_of_term
from wavegen.laws.mapped import clip_law
from wavegen.laws.operations import EnvelopeTerm, GatedTerm
from wavegen.laws.rail_mixing import image_term, mean_power_of, shifted_term
from wavegen.laws.term import GaussianTerm, NoLaw, Scaled

NOISE = GaussianTerm(name="noise", mean_power=2.0, data=frozenset({"a"}))
T = np.linspace(0.0, 6.0, 25)
SIGNAL, IMAGE = 0.9 * cmath.exp(0.3j), 0.4 * cmath.exp(-1.1j)


def test_noise_with_its_image_is_two_rails_of_unequal_power():
    term = image_term(NOISE, SIGNAL, IMAGE)
    b = 2 * 0.36 / 0.97
    low, high = 2.0 * (1 - b) / 2, 2.0 * (1 + b) / 2  # variances along the axes of the ellipse
    angle = np.linspace(0, np.pi, 400, endpoint=False)
    spread = low * np.sin(angle) ** 2 + high * np.cos(angle) ** 2
    want = np.exp(-0.5 * np.outer(T**2, spread)).mean(axis=1)
    assert term.characteristic(T) == pytest.approx(want, abs=1e-14)
    assert term.mean_power == 2.0
    assert term.symmetry == 2
    assert term.data == {"a"}
    law = law_of_term(term)
    assert isinstance(law, HoytLaw)
    assert law.impropriety == pytest.approx(b, rel=1e-14)


def test_directions_average_to_the_function():
    angle = (np.arange(300) + 0.5) * (2 * np.pi / 300)
    for term in (image_term(NOISE, SIGNAL, IMAGE), shifted_term(NOISE, 0.5 - 0.2j)):
        mean = term.directional(T, angle).mean(axis=1)
        assert mean.real == pytest.approx(term.characteristic(T), abs=1e-13)
        assert mean.imag == pytest.approx(0.0, abs=1e-13)


def test_a_clipped_signal_is_refused_by_name():
    clipped = EnvelopeTerm(
        name="clipped", law=clip_law(GaussianLaw(), 5.0), peak=10**0.25, mean_power=1.0
    )
    assert image_term(clipped, SIGNAL, IMAGE) == NoLaw(reason="clipped, with its image, has no law")
    assert isinstance(law_of_term(shifted_term(clipped, 0.3j)), NoLaw)  # a ring is too sharp


def test_a_known_line_stays_one():
    line = LineTerm.of(2j)
    assert image_term(line, SIGNAL, IMAGE).peak == pytest.approx(2.0)
    moved = shifted_term(line, 1.0)
    assert moved.value == 1 + 2j
    assert isinstance(law_of_term(moved), ConstantLaw)


def test_a_constant_adds_its_power():
    term = shifted_term(NOISE, 0.6 + 0.8j)
    assert term.mean_power == pytest.approx(3.0, rel=1e-7)
    assert term.symmetry == 1
    assert mean_power_of(NOISE) == pytest.approx(2.0, rel=1e-7)
    louder = shifted_term(Scaled.of(NOISE, gain=3.0), 1.0)
    assert louder.mean_power == pytest.approx(19.0, rel=1e-6)


def test_what_is_gated_or_has_no_directions_is_refused_by_name():
    gated = GatedTerm.of(NOISE, np.array([0.0, 1.0]))
    tones = LinesTerm.of([1, 4, 9], [1, 1j, 0.5], n_samples=64)
    square = GaussianTerm(name="square", symmetry=4)
    for term, words in ((gated, "gated"), (tones, "tones"), (square, "square")):
        found = image_term(term, SIGNAL, IMAGE)
        assert isinstance(found, NoLaw)
        assert words in found.reason
        assert "with its image" in found.reason
    for term in (gated, tones):
        found = shifted_term(term, 1.0)
        assert isinstance(found, NoLaw)
        assert "with a DC offset" in found.reason
    assert not isinstance(shifted_term(square, 1.0), NoLaw)
