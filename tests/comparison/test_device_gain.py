import pytest

from wavegen.comparison.device_gain import device_gain
from wavegen.core.errors import SignalError


def test_absolute_where_both_sides_are(side, noise, rapp):
    samples = noise(1 << 15) * 0.4
    ends = {"tolerance_db": 0.2, "down_to": 1e-3}
    source = side(samples, level_dbm=-30.0)
    found = device_gain((source, side(rapp(samples), level_dbm=10.0)), None, **ends)
    assert found.is_absolute
    assert found.small.gain_db == pytest.approx(40, abs=0.02)
    assert found.falls[0].input_db == pytest.approx(-30 - 1.17, abs=0.05)  # p1db of Rapp, p = 2
    plain = device_gain((source, side(rapp(samples))), None, **ends)
    assert not plain.is_absolute
    assert plain.linearity.verdict == "differ"
    assert plain.fit.smoothness == pytest.approx(2, rel=0.05)


def test_too_few_levels(side, noise):
    short = side(noise(1 << 5), loops=False)
    with pytest.raises(SignalError) as caught:
        device_gain((short, short), None, tolerance_db=0.2, down_to=1e-3)
    assert "levels" in caught.value.problem
