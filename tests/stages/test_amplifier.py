import math
from dataclasses import dataclass

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.stages.amplifier import Amplifier, rms_amplitude


@dataclass(frozen=True, eq=False, kw_only=True)
class Cubic(Amplifier):
    """Gain 1 + e r^2 - r^4, which expands before it compresses."""

    e: float = 0.0

    def gain(self, amplitude):
        return (1 + self.e * amplitude**2 - amplitude**4).astype(np.complex128)


def test_the_compression_point_is_below_the_highest_gain():
    fall = 10 ** (-1 / 20)
    plain = Cubic(name="a", saturation=0.6, largest=0.9)
    assert plain.compression == pytest.approx((1 - fall) ** 0.25, rel=1e-9)
    # Highest gain 1 + e^2/4 at r^2 = e/2; then 1 + e s - s^2 = fall (1 + e^2/4) by its root.
    e = 0.5
    highest = 1 + e * e / 4
    s = (e + math.sqrt(e * e + 4 * (1 - fall * highest))) / 2
    expanding = Cubic(name="b", saturation=0.9, largest=0.95, e=e)
    assert expanding.compression == pytest.approx(math.sqrt(s), rel=1e-6)


def test_a_model_that_is_known_too_little_has_no_compression_point():
    assert Cubic(name="a", saturation=0.6, largest=0.2).compression is None


def test_back_off_from_either_point(bench):
    amplifier = Cubic(name="a", saturation=0.6, largest=0.9)
    site = bench.site(10)
    got = rms_amplitude(site, amplifier, back_off_db=6.0, back_off_from="saturation")
    assert got == pytest.approx(0.6 * 10**-0.3)
    got = rms_amplitude(site, amplifier, back_off_db=-2.0, back_off_from="compression")
    assert got == pytest.approx(amplifier.compression * 10**0.1)
    for lacking, point in (
        (Cubic(name="a", saturation=0.6, largest=0.2), "compression"),
        (Cubic(name="a"), "saturation"),
    ):
        with pytest.raises(RecipeError) as caught:
            rms_amplitude(site, lacking, back_off_db=0.0, back_off_from=point)
        assert caught.value.where == "stages[0].back_off_from"


def test_output():
    assert Cubic(name="a", saturation=0.5).output(0.5) == pytest.approx(0.5 * (1 - 0.0625))
    assert Cubic(name="a", saturation=0.5).highest_output == pytest.approx(0.46875)
