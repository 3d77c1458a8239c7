import math

import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import GatedLaw, clip_law
from wavegen.laws.quantised import QuantisedLaw, power_above, quantised_law, step_error_db
from wavegen.laws.term import NoLaw

GAUSSIAN = GaussianLaw()


def test_fine_steps_let_the_law_pass_down_to_full_scale():
    law = quantised_law(GAUSSIAN, bits=14, full_scale_db=12.0)
    level_db = np.array([-10.0, 0.0, 6.0, 11.9])
    assert law.ccdf(level_db).tolist() == GAUSSIAN.ccdf(level_db).tolist()
    assert law.level_db(1e-4) == GAUSSIAN.level_db(1e-4)
    assert law.name == "complex Gaussian, then 14 bits"
    assert law.holds == "over seeds"
    # Below the probability of full scale it does not speak; both rails there are the most.
    assert law.lowest_probability == pytest.approx(math.exp(-(10**1.2)))
    assert law.peak_db == pytest.approx(15.01, abs=0.001)
    assert float(law.ccdf(15.1)) == 0
    assert float(law.level_db(0.0)) == law.peak_db
    assert quantised_law(GAUSSIAN, bits=16, full_scale_db=14.0).lowest_probability < 1e-9


@pytest.mark.parametrize(("bits", "is_lawful"), [(11, False), (12, True), (14, True)])
def test_steps_of_gaussian_noise(bits, is_lawful):
    found = quantised_law(GAUSSIAN, bits=bits, full_scale_db=12.0)
    assert isinstance(found, QuantisedLaw) == is_lawful
    if not is_lawful:
        assert "complex Gaussian, then 11 bits, has no law" in found.reason
        assert "0.001 dB are let pass" in found.reason


def test_full_scale_that_is_passed_too_often_is_refused():
    found = quantised_law(GAUSSIAN, bits=16, full_scale_db=9.0)
    assert isinstance(found, NoLaw)
    assert "above full scale" in found.reason
    assert power_above(GAUSSIAN, 9.0) == pytest.approx(math.exp(-(10**0.9)), rel=1e-9)
    assert power_above(clip_law(GAUSSIAN, 6.0), 7.0) == 0.0


def test_a_wall_moves_by_half_a_diagonal():
    clipped = clip_law(GAUSSIAN, 7.0)
    coarse = step_error_db(clipped, bits=12, full_scale_db=8.0)
    step = 10**0.4 / 2**11
    assert coarse == pytest.approx(20 / math.log(10) * step / math.sqrt(2) / 10**0.35, rel=1e-9)
    assert isinstance(quantised_law(clipped, bits=12, full_scale_db=8.0), NoLaw)
    law = quantised_law(clipped, bits=14, full_scale_db=8.0)
    assert law.peak_db == pytest.approx(7.0)
    assert law.lowest_probability == 0.0


def test_what_every_loop_follows_is_not_told():
    found = quantised_law(ConstantLaw(), bits=16, full_scale_db=3.0)
    assert isinstance(found, NoLaw)
    assert "one loop moves by steps" in found.reason


def test_full_scale_of_a_gated_signal_is_over_its_on_time():
    gated = GatedLaw(source=GAUSSIAN, duty_fully_on=0.25, ramp=np.zeros(0))
    law = quantised_law(gated, bits=14, full_scale_db=12.0)
    assert law.on_time.lowest_probability == pytest.approx(math.exp(-(10**1.2)))
    assert law.level_db(1e-4) == gated.level_db(1e-4)
    assert isinstance(quantised_law(gated, bits=10, full_scale_db=12.0), NoLaw)
