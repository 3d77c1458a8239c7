"""The run of symbols with the highest peak."""

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.meters.seam import seam_figure
from wavegen.sources.data.pattern import BitText, Pattern
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.rotation import Rotation
from wavegen.sources.single_carrier import SingleCarrier

RATE = Fraction(4_000_000)


def site(n_symbols=1024, per_symbol=4):
    return Site(
        sample_rate_hz=Fraction(per_symbol * 1_000_000),
        n_samples=n_symbols * per_symbol,
        seed=3,
        label="signal",
        path="signal",
    )


def carrier(name, **more):
    return SingleCarrier(
        constellation=Constellation.parse(name),
        symbol_rate_hz=Fraction(1_000_000),
        worst_case=True,
        **more,
    )


@pytest.mark.parametrize("name", ["bpsk", "qpsk", "16qam", "64qam", "8psk"])
def test_the_peak_is_the_highest_that_the_law_knows(name):
    settings, place = carrier(name), site()
    samples = np.abs(samples_of(settings.build(place)).astype(np.complex128)) ** 2
    plain = replace(settings, worst_case=False)
    bound = plain.law(place).peak_db
    mean = np.mean(np.abs(samples_of(plain.build(site(1 << 14)))) ** 2)
    reached = 10 * np.log10(samples.max() / mean)
    # the law's peak of points that are no grid is that of turning phases, a little above
    assert bound - (0.25 if name == "8psk" else 0.03) < reached < bound + 0.02
    (note,) = [item for item in place.notes if item.where == "signal.worst_case"]
    at = int(note.text.split("at sample ")[1].split(":")[0])
    assert samples.argmax() == at
    told = float(note.text.split("can have, ")[1].split(" dB")[0])
    assert told == pytest.approx(reached, abs=0.05)


def test_all_but_the_run_are_the_same_data():
    place = site()
    with_run = carrier("qpsk").build(place).inputs[0]
    plain = replace(carrier("qpsk"), worst_case=False).build(place).inputs[0]
    differing = np.flatnonzero(samples_of(with_run) != samples_of(plain))
    assert differing.min() >= 512 - 64
    assert differing.max() <= 512 + 65
    assert seam_figure(carrier("qpsk").build(place), cycle_samples=4).is_clean


def test_turned_symbols_are_allowed_for():
    settings = carrier("qpsk", rotation=Rotation.parse("pi/4"))
    samples = np.abs(samples_of(settings.build(site())))
    plain = np.abs(samples_of(carrier("qpsk").build(site())))
    assert 20 * np.log10(samples.max() / plain.max()) > -1.0


@pytest.mark.parametrize("key", ["stagger", "differential"])
def test_not_with_what_ties_symbols_together(key):
    with pytest.raises(QuantityError) as caught:
        carrier("qpsk", **{key: True})
    assert caught.value.key == "worst_case"


def test_not_in_a_pattern_nor_in_a_short_loop():
    with pytest.raises(RecipeError, match="pattern"):
        carrier("qpsk", data=Pattern(bits=BitText.parse("1100"))).build(site())
    with pytest.raises(RecipeError, match="a run of 129"):
        carrier("qpsk").build(site(200))
