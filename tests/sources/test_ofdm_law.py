import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.laws.term import NoLaw
from wavegen.sources.data.pattern import BitText, Pattern
from wavegen.sources.data.prbs import PseudoRandom
from wavegen.sources.data.random import Random
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.ofdm_parts import Group, Pilots
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

SPACING = Fraction(15000)


def group(subcarriers="-40..-1, 1..40", constellation="qpsk", **more):
    return Group(
        subcarriers=IndexSet.parse(subcarriers),
        constellation=Constellation.parse(constellation),
        **more,
    )


def ofdm(*groups, **more):
    return Ofdm(
        subcarrier_spacing_hz=SPACING,
        groups=groups,
        cyclic_prefix=CyclicPrefix.parse("1/8"),
        **more,
    )


def site(settings, n_fft=128):
    n = settings.cycle(SPACING * n_fft, "signal").n_samples
    return Site(sample_rate_hz=SPACING * n_fft, n_samples=n, seed=4, label="a", path="signal")


def reason(settings):
    found = settings.law(site(settings))
    assert isinstance(found, NoLaw), found
    return found.reason


def test_what_has_no_law_says_so_by_name():
    assert "DFT-spread" in reason(ofdm(group(spreading="dft")))
    assert "bpsk" in reason(ofdm(group(constellation="bpsk")))  # 80 subcarriers: too many
    assert "lattices" in reason(ofdm(group("1..8", "8psk")))
    assert "finite pattern" in reason(ofdm(group(data=Pattern(bits=BitText("1100")))))
    pn = PseudoRandom(sequence="pn23")
    assert "the same pn23" in reason(ofdm(group("-50..-1", data=pn), group("1..50", data=pn)))


def test_few_subcarriers_are_gone_through_sample_by_sample():
    few = ofdm(group("1..24", "64qam"))
    assert "24 subcarriers" in few.term(site(few)).reason
    law = few.law(site(few))
    # E x^2 = 2 + k4 / N: 2 int x P(p > x) dx by Simpson's rule.
    x = np.linspace(0, 40, 4001)
    weights = np.r_[1, np.tile([4, 2], 1999), 4, 1] / 300
    above = law.ccdf(10 * np.log10(np.maximum(x, 1e-30)))
    assert np.sum(weights * above) == pytest.approx(1, abs=1e-6)
    k4 = np.mean(np.abs(Constellation.parse("64qam").points) ** 4) - 2
    assert 2 * np.sum(weights * x * above) == pytest.approx(2 + k4 / 24, abs=1e-5)
    # One subcarrier with nearly all the power leaves few, too, whatever their number is.
    loud = ofdm(group("1..60"), group("61", level_db=20.0))
    assert "of 3 subcarriers" in loud.term(site(loud)).reason


def test_a_pseudo_random_sequence_serves_down_to_its_length():
    settings = ofdm(group(data=PseudoRandom(sequence="pn15")))
    law = settings.law(site(settings))
    assert law.lowest_probability == pytest.approx(10 / 32767)
    assert settings.term(site(settings)).data == {"pn15"}


def test_streams_carry_the_names_of_their_parts():
    settings = ofdm(group("-50..-1"), group("1..50", data=Random(share="other")))
    assert settings.term(site(settings)).data == {"a.groups[0]", "other.groups[1]"}


def test_building_the_law_tells_nothing_twice():
    settings = ofdm(
        group(), pilots=(Pilots(subcarriers=IndexSet.parse("41..43"), values=PilotValues((1,))),)
    )
    here = site(settings)
    assert not isinstance(settings.law(here), NoLaw)
    assert here.notes == []


def test_pilots_alone_are_known_exactly():
    settings = ofdm(
        pilots=(Pilots(subcarriers=IndexSet.parse("-8, 8"), values=PilotValues.parse([1])),)
    )
    law = settings.law(site(settings))
    assert law.holds == "every loop"
    # Two equal tones: arccos(x - 1) / pi; 16 instants of their period, 144 samples.
    assert law.ccdf(0.0) == pytest.approx(0.5, abs=2 / 16)
    assert law.peak_db == pytest.approx(3.0103, abs=1e-3)
    assert float(law.level_db(1e-6)) == pytest.approx(3.0103, abs=1e-3)


def test_silent_symbols_raise_the_others():
    on = ofdm(group())
    half = ofdm(group(symbols=SymbolSet.parse("0")), frame_symbols=2)
    law, whole = (settings.law(site(settings)) for settings in (half, on))
    assert float(law.ccdf(-100.0)) == pytest.approx(0.5, abs=1e-9)
    assert law.level_db([0.05, 5e-5]) == pytest.approx(
        whole.level_db([0.1, 1e-4]) + 10 * math.log10(2), abs=1e-6
    )


def test_many_subcarriers_are_gaussian():
    settings = ofdm(group("-600..-1, 1..600", "64qam"))
    law = settings.law(site(settings, 2048))
    for probability, level_db in ((0.1, 3.6222), (1e-3, 8.3934), (1e-6, 11.4039)):
        # 1/N of the fourth cumulant: 0.005 dB at 1e-6.
        assert float(law.level_db(probability)) == pytest.approx(level_db, abs=0.01)
    assert float(law.level_db(1e-6)) < 11.4039


def test_groups_far_apart_in_level_are_counted_each():
    quiet = ofdm(
        group("-55..-1", symbols=SymbolSet.parse("0")),
        group("1..55", level_db=-40.0, symbols=SymbolSet.parse("1")),
        frame_symbols=2,
    )
    law = quiet.law(site(quiet))
    single = ofdm(group("-55..-1")).law(site(ofdm(group("-55..-1"))))
    # Half the time 40 dB down: the loud half rules above, the quiet one is seen below.
    assert law.level_db(5e-4) == pytest.approx(float(single.level_db(1e-3)) + 3.0099, abs=1e-3)
    assert float(law.ccdf(-30.0)) == pytest.approx(0.5 * (1 + 0.02), abs=0.02)
    assert float(law.ccdf(-42.0)) > 0.6


def test_the_peak_is_a_bound():
    settings = ofdm(group("1..64", "16qam"))
    law = settings.law(site(settings))
    assert law.peak_db == pytest.approx(10 * math.log10(64 * 1.8), abs=1e-9)
    assert float(law.level_db(0.0)) == pytest.approx(law.peak_db)


def test_the_law_of_papr_per_symbol_is_apart():
    settings = ofdm(group("-50..-1, 1..50"))
    law = settings.symbol_papr_law(site(settings))
    place = np.concatenate((np.arange(-50, 0), np.arange(1, 51)))
    assert law.rms_cycles == pytest.approx(math.sqrt(np.mean(place**2) + 1 / 12))
    with_pilots = replace(
        settings,
        pilots=(Pilots(subcarriers=IndexSet.parse("55"), values=PilotValues.parse([1])),),
    )
    assert isinstance(with_pilots.symbol_papr_law(site(with_pilots)), NoLaw)
    few = ofdm(group("1..5"))
    assert isinstance(few.symbol_papr_law(site(few)), NoLaw)
