import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import NoLaw
from wavegen.stages.channel.gate import Gate
from wavegen.stages.converter.dc_offset import DcOffset


def test_a_constant_is_added(bench):
    source = bench.given([2.0, -2.0j, -2.0, 2.0j])
    site = bench.site(4)
    signal = DcOffset(level_db=-20.0, phase_deg=90.0).build(site, source)
    np.testing.assert_allclose(samples_of(signal) - samples_of(source), 0.2j, atol=1e-6)
    assert signal.mean_power == pytest.approx(source.mean_power * 1.01)
    assert "+0.0432 dB" in site.notes[0].text


def test_of_a_gated_signal_the_on_time_counts_and_the_constant_stays(bench):
    gate = Gate(pattern="10", slot=TimeSpan.parse("100 samples"))
    gated = gate.build(bench.site(400), bench.given([1.0], n_samples=400))
    signal = DcOffset(level_db=-20.0).build(bench.site(400), gated)
    np.testing.assert_allclose(samples_of(signal), np.tile([1.1] * 100 + [0.1] * 100, 2), atol=1e-6)
    assert signal.mean_power is None


def test_silence_is_refused(bench):
    with pytest.raises(RecipeError):
        DcOffset(level_db=-20.0).build(bench.site(2), bench.given([0, 0]))


def test_law(bench):
    assert isinstance(DcOffset(level_db=-10.0).law(bench.site(1), ConstantLaw()), NoLaw)
    n = 1 << 17
    signal = DcOffset(level_db=-3.0).build(bench.site(n), bench.gaussian(n))
    law = DcOffset(level_db=-3.0).law(bench.site(n), GaussianLaw())
    power = np.abs(samples_of(signal).astype(np.complex128)) ** 2
    for probability in (0.3, 0.01, 1e-3):
        level = 10 ** (float(law.level_db(probability)) / 10)
        share = np.mean(power > level * power.mean())
        # 4 sigma of independent samples; the mean of a record moves the level by 0.2 %.
        assert share == pytest.approx(
            probability, abs=5 * np.sqrt(probability / n) + 0.01 * probability
        )
