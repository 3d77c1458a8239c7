"""Sums of carriers: anchors computed apart, exact moments, and loops that were made."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.laws.inversion import law_of_term
from wavegen.laws.term import NoLaw
from wavegen.sources.carrier import Carrier
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.noise import Noise
from wavegen.sources.phase_modulation import PhaseModulation
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.sources.tones import Tone, Tones
from wavegen.stages.combine.sum import Part, Sum

RATE = Fraction(16_000_000)
SYMBOL_RATE = Fraction(2_000_000)
N_SAMPLES = 8 * 48_000
"""24 ms: offsets are multiples of 41.67 Hz."""

QPSK = SingleCarrier(constellation=Constellation.parse("qpsk"), symbol_rate_hz=SYMBOL_RATE)
QAM16 = SingleCarrier(constellation=Constellation.parse("16qam"), symbol_rate_hz=SYMBOL_RATE)
"""Its law takes a fifth of the time."""
APART = Fraction(3_187_000)
"""An offset that turns through 16000 phases."""


def sum_of(*parts):
    return Sum(parts=tuple(Part(**part) for part in parts))


def site(n_samples=N_SAMPLES, seed=1):
    return Site(sample_rate_hz=RATE, n_samples=n_samples, seed=seed, label="signal", path="signal")


def term_of(settings, here):
    terms = []
    for number, part in enumerate(settings.parts):
        path = f"{here.path}.parts[{number}]"
        terms.append(part.signal.term(here.at(f"{path}.signal", part.name or path)))
    return settings.term(here, terms)


def law_of(settings, here=None):
    made = term_of(settings, here or site())
    return made if isinstance(made, NoLaw) else law_of_term(made)


def power_of(settings, here):
    signals = []
    for number, part in enumerate(settings.parts):
        path = f"{here.path}.parts[{number}]"
        signals.append(part.signal.build(here.at(f"{path}.signal", part.name or path)))
    samples = samples_of(settings.combine(here, signals)).astype(np.complex128)
    return samples.real**2 + samples.imag**2


def test_two_aligned_carriers():
    """Two QPSK RRC 0.22 carriers of one symbol clock: 6.58 dB at 0.01 %; 6.43 were their clocks
    free (both simulated apart, 0.01 dB). At a rate with another clock it is 6.43.
    """
    pair = [{"signal": QPSK}, {"signal": QPSK, "frequency_offset_hz": APART}]
    assert law_of(sum_of(*pair)).level_db(1e-4) == pytest.approx(6.581, abs=2e-3)
    other = SingleCarrier(
        constellation=Constellation.parse("qpsk"), symbol_rate_hz=RATE * Fraction(2, 15)
    )
    free = sum_of(pair[0], {"signal": other, "frequency_offset_hz": APART})
    assert law_of(free, site(15 * 24_000)).level_db(1e-4) == pytest.approx(6.434, abs=5e-3)


@pytest.mark.parametrize(("phase_deg", "level"), [(0.0, 5.12), (45.0, 5.66)])
def test_a_carrier_on_the_frequency_of_another(phase_deg, level):
    """QPSK and an equal unmodulated carrier at 0.01 %: by its phase; 5.53 if it ran freely."""
    on = {"signal": Carrier(), "phase_deg": phase_deg}
    assert law_of(sum_of({"signal": QPSK}, on)).level_db(1e-4) == pytest.approx(level, abs=0.01)


def test_a_carrier_beside_another():
    off = {"signal": Carrier(), "frequency_offset_hz": APART}
    assert law_of(sum_of({"signal": QPSK}, off)).level_db(1e-4) == pytest.approx(5.53, abs=0.01)


@pytest.mark.parametrize(
    "parts",
    [
        [
            {"signal": Noise(bandwidth_hz=RATE)},
            {"signal": QPSK, "frequency_offset_hz": APART},
            {"signal": Carrier(), "frequency_offset_hz": -APART},
        ],
        [
            {"signal": QPSK},
            {"signal": QPSK, "frequency_offset_hz": APART, "level_db": -3.0},
        ],
    ],
)
def test_second_moment_of_a_sum(parts):
    """E x^2 = 2 + sum w^2 (k - 2), ``w`` the shares of power, ``k`` each part's own E x^2, at each
    instant of the shared clock (derivation). Tolerance 1e-4: 2000 points of the curve.
    """
    law = law_of(sum_of(*parts))
    shares = np.array([10 ** (part.get("level_db", 0.0) / 10) for part in parts])
    shares /= shares.sum()
    want = 0.0
    term = QPSK.term(site())
    for n in range(8):
        taps = term.taps(Fraction(n, 8))
        power = np.sum(taps**2)
        fourth = 2 * power**2 - np.sum(taps**4)
        at = {"Noise": (1.0, 2.0), "Carrier": (1.0, 1.0), "SingleCarrier": (power, fourth)}
        kinds = [at[type(part["signal"]).__name__] for part in parts]
        mean = sum(w * p for w, (p, _) in zip(shares, kinds, strict=True))
        cross = [w**2 * (q - 2 * p**2) for w, (p, q) in zip(shares, kinds, strict=True)]
        want += (2 * mean**2 + sum(cross)) / 8
    top = 40.0 if law.peak_db > 20 else 10 ** (law.peak_db / 10)
    step = top / 2000
    x = step * (np.arange(2000) + 0.5)
    tail = law.ccdf(10 * np.log10(x))
    assert np.sum(tail) * step == pytest.approx(1, rel=1e-4)
    assert 2 * np.sum(x * tail) * step == pytest.approx(want, rel=1e-4)


def msk(symbol_rate_hz):
    return PhaseModulation(scheme="msk", symbol_rate_hz=Fraction(symbol_rate_hz))


SUMS = {
    "free": [{"signal": QPSK}, {"signal": QPSK, "frequency_offset_hz": APART, "level_db": -2.0}],
    "one frequency": [{"signal": QAM16}, {"signal": QAM16, "phase_deg": 20.0}],
    "carrier inside": [{"signal": QPSK}, {"signal": Carrier(), "phase_deg": 30.0}],
    "even distances": [{"signal": QAM16, "frequency_offset_hz": k * APART} for k in (-1, 0, 1)],
    "tied to the symbols": [
        {"signal": QAM16},
        {"signal": Carrier(), "frequency_offset_hz": 2 * SYMBOL_RATE},
    ],
    "constant envelopes": [
        {"signal": msk(2_000_000), "frequency_offset_hz": k * Fraction(1_234_500)} for k in (-1, 2)
    ],
    "tones and noise": [
        {
            "signal": Tones(
                tones=tuple(Tone(frequency_offset_hz=Fraction(k)) for k in (0, 1000, 3000))
            )
        },
        {"signal": Noise(bandwidth_hz=RATE), "level_db": -3.0},
    ],
    "tones beside symbols": [
        {"signal": QPSK},
        {
            "signal": Tones(count=4, spacing_hz=Fraction(250_000), phases="newman"),
            "frequency_offset_hz": APART,
        },
    ],
}


@pytest.mark.parametrize("name", SUMS)
def test_loops_follow_their_law(name):
    """48 000 symbols made. Tolerance: 5 sigma of as many independent draws, at 50 ... 0.3 %."""
    settings = sum_of(*SUMS[name])
    here = site()
    law = law_of(settings, here)
    assert not isinstance(law, NoLaw), law
    power = power_of(settings, here)
    probability = np.array([0.5, 0.1, 0.01, 3e-3])
    level = law.level_db(probability)
    # At a wall the level hangs on the loop's own mean: two constant envelopes end at 3.0103 dB.
    probability = probability[level < law.peak_db - 0.05]
    level = level[level < law.peak_db - 0.05]
    measured = (power[:, None] > power.mean() * 10 ** (level / 10)).mean(axis=0)
    slack = 5 * np.sqrt(probability * (1 - probability) / 48_000)
    assert np.all(np.abs(measured - probability) < slack)


def test_shared_data_have_no_law():
    """The same PRBS on two carriers, though they stand apart."""
    same = {"signal": QPSK, "name": "a"}
    assert not isinstance(law_of(sum_of(same, {**same, "name": "b"})), NoLaw)
    made = law_of(sum_of(same, {**same, "frequency_offset_hz": APART}))
    assert isinstance(made, NoLaw)
    assert made.reason.startswith("shared data")
