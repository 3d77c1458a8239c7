import math

import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import ClippedLaw, GatedLaw, MappedLaw, amplitude_reach, clip_law
from wavegen.laws.memoryless import polar_clip
from wavegen.laws.periodic import PeriodicLaw
from wavegen.laws.term import NoLaw

TWO_TONES = PeriodicLaw.of_harmonics(np.array([0, 1]), np.array([1.0, 1.0 + 0j]))
NOTHING = np.empty(0)


def test_a_rising_curve_moves_every_level():
    # p^2 of an exponential power: mean 2, so P(p^2 / 2 > L) = exp(-sqrt(2 L)).
    law = MappedLaw(source=GaussianLaw(), curve=lambda r: r**2)
    assert law.mean == pytest.approx(2, rel=1e-9)
    level_db = np.array([-10.0, 0, 5, 12])
    want = np.exp(-np.sqrt(2 * 10 ** (level_db / 10)))
    assert law.ccdf(level_db) == pytest.approx(want, rel=1e-6)
    assert law.level_db(want) == pytest.approx(level_db, abs=1e-8)
    assert law.peak_db == math.inf
    assert law.moment(2) == pytest.approx(24 / 4, rel=1e-8)  # E p^4 / (E p^2)^2
    assert law.moment(3) == pytest.approx(720 / 8, rel=1e-4)  # E p^6: cut off at the reach


def test_a_falling_curve_turns_the_distribution_over():
    # 1 / (1 + p) rises above L where p < 1 / L - 1.
    law = MappedLaw(source=GaussianLaw(), curve=lambda r: (1 + r**2) ** -0.5)
    mean = float(np.trapezoid(np.exp(-(x := np.linspace(0, 60, 2_000_001))) / (1 + x), x))
    assert law.mean == pytest.approx(mean, rel=1e-6)
    level = 0.5 / law.mean
    assert law.ccdf(10 * math.log10(level)) == pytest.approx(1 - math.exp(-1.0), rel=1e-6)
    assert law.level_db(1 - math.exp(-1.0)) == pytest.approx(10 * math.log10(level), abs=1e-5)
    assert law.peak_db == pytest.approx(-10 * math.log10(law.mean), abs=1e-9)


def test_a_clip_written_as_a_curve_is_the_clip():
    curve, kinks = polar_clip(4.0)
    mapped = MappedLaw(source=GaussianLaw(), curve=curve, kinks=kinks)
    clipped = clip_law(GaussianLaw(), mapped.peak_db)
    assert clipped.mean == pytest.approx(mapped.mean, rel=1e-12)
    probability = [0.9, 0.5, 0.1, 0.01, 1e-6]
    assert clipped.level_db(probability) == pytest.approx(mapped.level_db(probability), abs=1e-10)
    assert clipped.ccdf([0.0, 3.0]) == pytest.approx(mapped.ccdf([0.0, 3.0]), rel=1e-9)


def test_a_clip_has_a_wall_and_an_atom():
    law = clip_law(GaussianLaw(), 4.0)
    assert law.peak_db == pytest.approx(4.0, abs=1e-10)
    assert law.ccdf(4.0) == 0
    assert law.ccdf(3.9999) == pytest.approx(law.share_clipped, rel=1e-3)
    assert float(law.level_db(law.share_clipped / 2)) == pytest.approx(4.0, abs=1e-10)


def test_a_clip_of_two_tones_keeps_what_lies_below():
    # P(p > x) = arccos(x - 1) / pi; E min(p, a) is its integral.
    law = clip_law(TWO_TONES, 2.0)
    x = np.linspace(0, law.ratio, 200_001)
    mean = float(np.trapezoid(np.arccos(x - 1) / np.pi, x))
    assert law.mean == pytest.approx(mean, rel=1e-4)
    assert law.ratio / law.mean == pytest.approx(10**0.2, rel=1e-9)
    assert law.holds == "every loop"


def test_nothing_to_clip():
    assert clip_law(TWO_TONES, 3.02) is TWO_TONES
    assert isinstance(clip_law(ConstantLaw(), 0.1), ConstantLaw)


def test_a_gate_without_ramps_raises_levels_by_the_duty():
    law = GatedLaw(source=GaussianLaw(), duty_fully_on=0.125, ramp=NOTHING)
    assert law.moment(3) == pytest.approx(6 * 8**2, rel=1e-12)  # 6 d / d^3
    on = GaussianLaw().level_db([0.1, 1e-3, 1e-8])
    assert law.level_db([0.0125, 1.25e-4, 1.25e-9]) == pytest.approx(
        on + 10 * math.log10(8), abs=1e-9
    )
    assert law.level_db(0.2) == -math.inf
    assert law.on_time.level_db(0.1) == on[0]


def test_ramps_are_counted_as_they_are():
    ramp = np.array([0.25, 0.5])
    law = GatedLaw(source=ConstantLaw(), duty_fully_on=0.5, ramp=ramp, ramp_share=0.2)
    for order in (2, 3):
        whole = 0.5 + 0.2 * np.mean(ramp ** (2 * order))
        assert law.moment(order) == pytest.approx(whole / law.mean**order, rel=3e-3)
    assert law.mean == pytest.approx(0.5 + 0.1 * (0.0625 + 0.25))
    just_below = 10 * np.log10(np.array([0.0625, 0.25, 1.0]) / law.mean) - 1e-6
    assert law.ccdf(just_below) == pytest.approx([0.7, 0.6, 0.5])
    assert law.peak_db == pytest.approx(-10 * math.log10(law.mean))


def test_a_gated_signal_is_clipped_over_its_on_time():
    gated = GatedLaw(source=GaussianLaw(), duty_fully_on=0.25, ramp=NOTHING)
    law = clip_law(gated, 6.0)
    assert isinstance(law, ClippedLaw)
    assert law.on_time.peak_db == pytest.approx(6.0, abs=1e-10)
    assert law.peak_db == pytest.approx(6.0 + 10 * math.log10(4), abs=1e-8)
    assert law.ccdf(0.0) == pytest.approx(0.25 * float(law.on_time.ccdf(-10 * math.log10(4))))


def test_what_is_zero_too_often_cannot_be_clipped():
    law = MappedLaw(
        source=GaussianLaw(), curve=lambda r: np.where(r < 1, 0.0, r), kinks=(1.0,), name="keyed"
    )
    found = clip_law(law, 3.0)  # on for exp(-1) of the time: 4.34 dB at least
    assert isinstance(found, NoLaw)
    assert "keyed" in found.reason
    assert isinstance(clip_law(law, 6.0), ClippedLaw)


def test_the_reach_is_the_peak_where_there_is_one():
    assert amplitude_reach(TWO_TONES) == pytest.approx(math.sqrt(2), rel=1e-9)
    assert amplitude_reach(GaussianLaw()) ** 2 == pytest.approx(2.25 * 12 * math.log(10))
