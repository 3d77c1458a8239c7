from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.side import Side, SideSettings
from wavegen.laws.gaussian import GaussianLaw


def test_what_is_not_told_is_not_known():
    side = Side(name="x", is_="a law", curve=ExactCurve(source=GaussianLaw()))
    assert side.mean_db is side.peak_db is side.signal is side.scale_curve is None
    assert not side.loops
    assert side.fault_db == 0
    settings = SideSettings(subject="x")
    assert not settings.part.is_cut
    assert settings.gate is None
