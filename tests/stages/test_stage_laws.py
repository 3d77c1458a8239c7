"""What stages say of laws, in a chain, against what they do."""

import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import Tap, render
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import BaseTerm, GaussianTerm, NoLaw
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.power import PowerMeter
from wavegen.sources.carrier import Carrier
from wavegen.sources.noise import Noise
from wavegen.stages import STAGES
from wavegen.stages.chain import build_chain, chain_law, chain_term
from wavegen.stages.channel.delay import Delay
from wavegen.stages.channel.filter import Filter
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.channel.resample import Resample
from wavegen.stages.channel.scale import Scale
from wavegen.stages.crest.clip import Clip

RATE = Fraction(1_000_000)
N = 1 << 19
SITE = Site(sample_rate_hz=RATE, n_samples=N, seed=3, label="a", path="signal")
GATE = Gate(
    duty_percent=Fraction(25), period=TimeSpan.parse("4096 us"), ramp=TimeSpan.parse("100 us")
)
HALF_SAMPLE = Delay(delay=TimeSpan.parse("0.5 samples"))
GAUSSIAN = GaussianLaw()


class Keyed(BaseTerm):
    """A part with a clock."""

    def characteristic(self, t, *, residue=0, modulus=1):
        return np.exp(-0.25 * t**2)


def check(stages, source, law):
    """Compare the loop with its law: 4 sigma of shares, V = 2 with a bin of the meter."""
    signal = build_chain(stages, SITE, source.build(SITE), "stages")
    taps = [Tap(name="all", signal=signal, meter=PowerMeter())]
    if on_time(signal) is not None:
        taps.append(Tap(name="on", signal=signal, meter=GatedPowerMeter(bursts=on_time(signal))))
    found = render(signal, taps=tuple(taps), workers=2)
    laws = {"all": law, "on": getattr(law, "on_time", None)}
    for name, statistics in found.items():
        for probability in (0.2, 0.05, 0.01, 1e-3):
            level_db = float(laws[name].level_db(probability))
            # Beside an atom: a level lower, by more than the meter's bins and the mean's spread.
            at_db = level_db - 0.1
            want = float(laws[name].ccdf(at_db))
            share = float(statistics.ccdf(at_db))
            near = abs(float(laws[name].ccdf(at_db + 0.02)) - float(laws[name].ccdf(at_db - 0.02)))
            sigma = math.sqrt(2 * want * (1 - want) / statistics.n_samples)
            assert share == pytest.approx(want, abs=4 * sigma + near)
    return found


CHAINS = {
    "clip": (Clip(ceiling_db=5.0),),
    "gate": (GATE,),
    "gate, clip": (GATE, Clip(ceiling_db=5.0)),
    "clip, gate, delay": (Clip(ceiling_db=5.0), GATE, Delay(delay=TimeSpan.parse("3 samples"))),
    "filter, half a sample, clip, scale": (
        Filter(bandwidth_hz=Fraction(500_000)),
        HALF_SAMPLE,
        Clip(ceiling_db=6.0),
        Scale(gain_db=-7.0),
    ),
}


@pytest.mark.parametrize("name", CHAINS)
def test_noise_follows_the_law_of_its_chain(name):
    stages = CHAINS[name]
    law = chain_law(stages, SITE, GAUSSIAN, "stages")
    assert not isinstance(law, NoLaw)
    found = check(stages, Noise(bandwidth_hz=RATE), law)
    if "gate, clip" in name:
        assert found["on"].papr_db == pytest.approx(5.0, abs=0.02)
    if math.isfinite(law.peak_db):
        assert found["all"].papr_db == pytest.approx(law.peak_db, abs=0.05)


def test_a_carrier_in_bursts_is_exact():
    law = chain_law((GATE,), SITE, Carrier().law(SITE), "stages")
    signal = build_chain((GATE,), SITE, Carrier().build(SITE), "stages")
    found = render(signal, taps=(Tap(name="p", signal=signal, meter=PowerMeter()),))["p"]
    assert found.papr_db == pytest.approx(law.peak_db, abs=1e-5)
    for level_db in (-20.0, 0.0, 3.0, 6.0, 6.2):
        # 100 amplitudes of ramps: one of them in a bin of the meter, 2 of 4096 samples.
        assert float(law.ccdf(level_db)) == pytest.approx(found.ccdf(level_db), abs=3 / 4096)


@pytest.mark.parametrize(
    ("stages", "words"),
    [
        ((Clip(ceiling_db=6.0), Filter(bandwidth_hz=Fraction(500_000))), "clipped, filtered"),
        ((GATE, HALF_SAMPLE), "gated, the whole, delayed by part of a sample"),
        ((Clip(ceiling_db=6.0), Resample(input_rate_hz=Fraction(2_000_000))), "resampled"),
    ],
)
def test_what_has_no_law_says_so_by_name(stages, words):
    found = chain_law((*stages, Scale(gain_db=1.0)), SITE, GAUSSIAN, "stages")
    assert isinstance(found, NoLaw)
    assert words in found.reason


def test_a_stage_that_knows_of_no_laws():
    class PeakCancellation:
        def build(self, site, source):
            return source

    for found in (
        chain_law((PeakCancellation(),), SITE, GAUSSIAN, "stages"),
        chain_term((PeakCancellation(),), SITE, GaussianTerm(name="noise"), "stages"),
    ):
        assert isinstance(found, NoLaw)
        assert "then peak cancellation" in found.reason


def test_no_law_stays_none():
    why = NoLaw(reason="a pattern")
    assert chain_law((Scale(gain_db=1.0),), SITE, why, "stages") is why
    assert chain_term((Scale(gain_db=1.0),), SITE, why, "stages") is why


def test_stages_that_do_nothing_leave_the_law():
    same = Resample(input_rate_hz=RATE)
    always = Gate(pattern="11", slot=TimeSpan.parse("64 samples"))
    assert chain_law((same, always), SITE, GAUSSIAN, "stages") is GAUSSIAN
    term = GaussianTerm(name="noise")
    assert chain_term((same, always), SITE, term, "stages") is term


def test_terms_of_parts():
    t = np.linspace(0, 6, 20)
    noise = GaussianTerm(name="noise")
    louder = chain_term((Scale(gain_db=6.0),), SITE, noise, "stages")
    assert louder.mean_power == pytest.approx(10**0.6)
    gated = chain_term((GATE, Delay(delay=TimeSpan.parse("5 us"))), SITE, noise, "stages")
    assert gated.clock_samples == 4096
    assert gated.mean_power == pytest.approx((1024 - 200 + 75) / 4096, rel=1e-6)
    assert gated.characteristic(t, residue=0, modulus=4096) == pytest.approx(1)  # before it opens
    clipped = chain_term((Clip(ceiling_db=3.0),), SITE, noise, "stages")
    assert clipped.peak == pytest.approx(10**0.15, rel=1e-6)
    assert 4 * (1 - clipped.characteristic(np.array([1e-3]))[0]) == pytest.approx(1e-6, rel=1e-5)
    for stages in (
        (Filter(bandwidth_hz=Fraction(500_000)),),  # its power is not known
        (GATE, Clip(ceiling_db=3.0)),
    ):
        assert isinstance(chain_term(stages, SITE, noise, "stages"), NoLaw)
    kept = Filter(bandwidth_hz=Fraction(500_000), keep_mean=True)
    assert chain_term((kept, HALF_SAMPLE), SITE, noise, "stages") is noise
    keyed = Keyed(name="keyed", clock_samples=2)
    assert isinstance(chain_term((kept,), SITE, keyed, "stages"), NoLaw)


CREST = {kind: target for kind, target in STAGES.items() if ".crest." in target}
NEEDED = {"tone_reservation": {"count": 2}, "selected_mapping": {}}
"""Settings beside a ceiling."""


@pytest.mark.parametrize("kind", CREST)
def test_crest_reduction_but_for_a_clip_has_no_law_and_says_so_by_name(kind):
    fields = NEEDED.get(kind, {}) | ({} if kind == "selected_mapping" else {"ceiling_db": 6.0})
    stages = [STAGES.load(kind)(**fields)]
    law = chain_law(stages, SITE, GAUSSIAN, "stages")
    term = chain_term(stages, SITE, GaussianTerm(mean_power=1.0), "stages")
    if kind == "clip":
        assert not isinstance(law, NoLaw)
        return
    for found in (law, term):
        assert isinstance(found, NoLaw)
        assert kind.replace("_", " ") in found.reason
    scaled = chain_law([*stages, Scale(gain_db=-1.0)], SITE, GAUSSIAN, "stages")
    assert scaled == law
