import numpy as np
import pytest

from wavegen.laws.composite import LineTerm
from wavegen.laws.term import BaseTerm, GaussianTerm, NoLaw, Scaled

T = np.array([0.0, 0.5, 2.0])


def test_no_law_says_why():
    assert NoLaw(reason="finite pattern").reason == "finite pattern"


def test_a_scaled_term_scales_power_peak_and_function():
    made = Scaled.of(GaussianTerm(data=frozenset({"a"})), gain=2.0)
    assert made.mean_power == 4.0
    assert made.data == {"a"}
    np.testing.assert_allclose(made.characteristic(T), np.exp(-(T**2)))


def test_a_turned_term_turns_its_directions():
    line = LineTerm.of(1 + 0j)
    angle = np.array([0.3, 1.0])
    made = Scaled.of(line, gain=3.0, turn_rad=0.3).directional(T, angle)
    np.testing.assert_allclose(made, np.exp(3j * np.outer(T, np.cos(angle - 0.3))), atol=1e-14)


def test_an_isotropic_term_is_the_same_in_every_direction():
    made = GaussianTerm().directional(T, np.arange(4.0))
    np.testing.assert_allclose(made, np.exp(-0.25 * T**2)[:, None] * np.ones(4))


def test_the_base_only_describes():
    with pytest.raises(TypeError, match="BaseTerm"):
        BaseTerm(name="nothing").characteristic(T)
