from fractions import Fraction

import pytest

from wavegen.core.site import Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.hoyt import HoytLaw
from wavegen.laws.mapped import clip_law
from wavegen.laws.term import NoLaw
from wavegen.stages import STAGES
from wavegen.stages.converter.dc_offset import DcOffset
from wavegen.stages.converter.iq_imbalance import IqImbalance
from wavegen.stages.rails import TreatsRailsApart, rails_law

SITE = Site(sample_rate_hz=Fraction(1_000_000), n_samples=4096, seed=1, path="signal", label="a")


def test_gaussian_noise_is_isotropic_by_its_law():
    law = rails_law(IqImbalance(gain_db=2.0), SITE, GaussianLaw(), "with its image")
    assert isinstance(law, HoytLaw)
    assert law.name == "complex Gaussian, with its image"
    same = IqImbalance().law(SITE, GaussianLaw())
    assert same.level_db(0.01) == pytest.approx(float(GaussianLaw().level_db(0.01)))
    assert DcOffset(level_db=-170.0).law(SITE, GaussianLaw()).level_db(0.01) == pytest.approx(
        float(GaussianLaw().level_db(0.01))
    )


@pytest.mark.parametrize("stage", [IqImbalance(gain_db=1.0), DcOffset(level_db=-20.0)])
def test_of_other_envelopes_alone_there_is_none_by_name(stage):
    found = stage.law(SITE, clip_law(GaussianLaw(), 6.0))
    assert isinstance(found, NoLaw)
    assert found.reason.startswith("complex Gaussian, clipped, with")


def test_which_stages_treat_rails_apart():
    found = {kind for kind in STAGES if issubclass_like(STAGES.load(kind))}
    assert found == {"iq_imbalance", "dc_offset"}


def issubclass_like(kind):
    return bool(getattr(kind, "treats_rails_apart", False)) and hasattr(kind, "term")


def test_the_protocol_tells_them():
    assert isinstance(IqImbalance(), TreatsRailsApart)
    assert not isinstance(STAGES.load("scale")(gain_db=1.0), TreatsRailsApart)
