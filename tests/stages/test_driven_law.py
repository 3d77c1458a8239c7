import dataclasses
import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import GaussianTerm, NoLaw
from wavegen.stages.chain import build_chain, chain_law
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.device.rapp import Rapp, RappCurve
from wavegen.stages.device.saleh import Saleh
from wavegen.stages.driven_law import driven_law, driven_term

CURVE = RappCurve(name="Rapp", saturation=1.0, smoothness=2.0)


class TestLaw:
    @pytest.mark.parametrize(
        "settings",
        [Rapp(input_back_off_db=5.0), Saleh(input_back_off_db=4.0)],
        ids=["rising", "falling beyond saturation"],
    )
    @pytest.mark.parametrize("is_gated", [False, True])
    def test_noise_follows_it(self, bench, settings, is_gated):
        n = 1 << 18
        gate = Gate(duty_percent=Fraction(50), period=TimeSpan.parse("4096 samples"))
        stages = (gate, settings) if is_gated else (settings,)
        law = chain_law(stages, bench.site(n), GaussianLaw(), "stages")
        signal = build_chain(stages, bench.site(n), bench.gaussian(n), "stages")
        samples = samples_of(signal).astype(np.complex128)
        shown = [(law, samples)]
        if is_gated:
            shown.append((law.on_time, samples[on_time(signal).is_on(0, n)]))
        for each, seen in shown:
            power = np.abs(seen) ** 2
            for probability in (0.3, 0.1, 0.01, 1e-3):
                level_db = float(each.level_db(probability))
                share = float(np.mean(power > power.mean() * 10 ** (level_db / 10)))
                # 4 sigma of a share of independent samples; the mean itself moves levels by
                # 0.01 dB, which on the flat top of a limited signal doubles the scatter.
                sigma = math.sqrt(probability / seen.size)
                near = abs(float(each.ccdf(level_db + 0.01)) - float(each.ccdf(level_db - 0.01)))
                assert share == pytest.approx(probability, abs=4 * sigma + near)

    def test_a_carrier_stays_one(self, bench):
        law = Saleh(input_back_off_db=3.0).law(bench.site(1), ConstantLaw())
        assert law.ccdf([-0.01, 0.01]).tolist() == [1.0, 0.0]

    def test_none_beyond_the_largest_input(self):
        found = driven_law(GaussianLaw(), dataclasses.replace(CURVE, largest=10.0), 0.5)
        assert isinstance(found, NoLaw)
        assert "largest input" in found.reason
        assert not isinstance(
            driven_law(ConstantLaw(), dataclasses.replace(CURVE, largest=10.0), 0.5), NoLaw
        )

    def test_a_part_of_a_composite_is_lawful_if_isotropic(self):
        noise = GaussianTerm(name="noise", mean_power=2.0, data=frozenset({"a"}))
        term = driven_term(noise, CURVE, 0.7)
        assert term.mean_power == 2.0
        assert term.data == {"a"}
        # E[J0(tR)] = 1 - t^2 P/4 + ... for small t: the mean power is kept.
        t = 1e-3
        value = float(term.characteristic(np.array([t]))[0])
        assert (1 - value) * 4 / t**2 == pytest.approx(2.0, rel=1e-4)
        square = dataclasses.replace(noise, symmetry=4)
        assert isinstance(driven_term(square, CURVE, 0.7), NoLaw)
