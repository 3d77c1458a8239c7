import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.listed import ListedLaw
from wavegen.laws.pulse_shaped import PulseShapedTerm
from wavegen.laws.term import NoLaw
from wavegen.sources.carrier_law import carrier_law, carrier_name, finite_pattern
from wavegen.sources.data.pattern import BitText, Pattern
from wavegen.sources.data.prbs import PseudoRandom
from wavegen.sources.data.random import Random
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.rotation import Rotation
from wavegen.sources.single_carrier import SingleCarrier

RATE = Fraction(1_000_000)


def carrier(constellation="qpsk", **fields):
    return SingleCarrier(
        constellation=Constellation.parse(constellation), symbol_rate_hz=RATE, **fields
    )


def site(ratio=4, n_symbols=4096, label="here"):
    return Site(
        sample_rate_hz=RATE * ratio,
        n_samples=int(n_symbols * ratio),
        seed=1,
        label=label,
        path="signal",
    )


def test_a_carrier_has_its_law_over_seeds():
    made = carrier().law(site())
    assert made.holds == "over seeds"
    assert made.name == "qpsk, root raised cosine 0.22"
    assert made.level_db([0.1, 1e-4]) == pytest.approx([1.991, 4.970], abs=1e-3)
    assert made.lowest_probability == 0.0


def test_no_notes_are_left():
    here = site()
    carrier(pulse=RootRaisedCosine(roll_off=0.22, span_symbols=4)).law(here)
    assert here.notes == []


@pytest.mark.parametrize(
    ("data", "streams", "lowest"),
    [
        (Random(), {"here"}, 0.0),
        (Random(share="there"), {"there"}, 0.0),
        (PseudoRandom(sequence="pn23"), {"pn23"}, 10 / (2**23 - 1)),
    ],
)
def test_streams_and_what_they_serve(data, streams, lowest):
    term = carrier(data=data).term(site())
    assert isinstance(term, PulseShapedTerm)
    assert term.data == streams
    assert term.lowest_probability == lowest


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (PseudoRandom(sequence="pn9"), "finite pattern: pn9 repeats after 511 bits"),
        (Pattern(bits=BitText("1100")), "finite pattern: the pattern repeats after 4 bits"),
    ],
)
def test_short_data_are_a_pattern_by_name(data, words):
    term = carrier(data=data).term(site())
    assert isinstance(term, NoLaw)
    assert term.reason == words
    law = carrier(data=data).law(site(n_symbols=1022))
    assert isinstance(law, ListedLaw)
    assert (law.name, law.holds) == (words, "every loop")


def test_a_pattern_in_a_long_loop_is_not_computed():
    made = carrier_law(carrier(data=PseudoRandom(sequence="pn9")), site(n_symbols=511 * 2048))
    assert isinstance(made, NoLaw)


def test_rotation_and_differential_reach_the_law():
    plain = carrier().law(site()).peak_db
    turned = carrier(rotation=Rotation(Fraction(1, 8)), differential=True).law(site())
    assert turned.peak_db < plain - 0.5
    coded = carrier(differential=True).law(site())
    assert coded.level_db(1e-4) == pytest.approx(carrier().law(site()).level_db(1e-4), abs=1e-9)
    staggered = carrier(stagger=True).law(site())
    assert staggered.peak_db < plain - 0.5


def test_leaning_rails_staggered_have_no_law():
    points = [[i, q] for i in (-1.0, 0.2) for q in (-1.0, 0.2)]
    made = carrier(points, stagger=True).law(site())
    assert isinstance(made, NoLaw)
    assert "lean to one side" in made.reason


def test_names():
    assert carrier_name(carrier(stagger=True)) == "staggered qpsk, root raised cosine 0.22"
    turned = carrier("8psk", rotation=Rotation(Fraction(3, 16)))
    assert carrier_name(turned) == "3 pi/8-turned 8psk, root raised cosine 0.22"


def test_finite_patterns(tmp_path):
    assert finite_pattern(Random(), tmp_path) is None
    assert finite_pattern(PseudoRandom(sequence="pn15"), tmp_path) == (32767, "pn15")


def test_the_law_meets_a_loop():
    """65536 symbols of 16QAM at 8/3 samples a symbol, within 5 sigma of as many draws."""
    made = carrier("16qam", pulse=RootRaisedCosine(roll_off=0.5))
    here = site(Fraction(8, 3), n_symbols=65_535)
    law = made.law(here)
    power = np.abs(samples_of(made.build(here)).astype(np.complex128)) ** 2
    levels = np.array([-3.0, 0.0, 3.0, 5.0])
    measured = (power[:, None] > power.mean() * 10 ** (levels / 10)).mean(axis=0)
    want = law.ccdf(levels)
    # A symbol counts once; the mean moves too: 0.5 % of it is 1 % of a probability or less.
    slack = 5 * np.sqrt(want * (1 - want) / 65_535)
    assert np.all(np.abs(measured - want) < slack)
    assert math.isfinite(law.peak_db)
