"""Sources behind sums and stages come back as they were sent."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.meters.arrivals import locate_sources
from wavegen.sources.carrier import Carrier
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.stages.channel.delay import Delay
from wavegen.stages.channel.filter import Filter, FilterTaps
from wavegen.stages.channel.gate import Gate
from wavegen.stages.channel.resample import Resample
from wavegen.stages.channel.scale import Scale
from wavegen.stages.combine.sum import Part, Sum
from wavegen.stages.crest.clip import Clip

RATE_HZ = Fraction(1_000_000)
N = 20_000


def site(path="signal", n=N, rate=RATE_HZ):
    return Site(sample_rate_hz=rate, n_samples=n, seed=1, label=path, path=path)


def carrier(path, symbol_rate_hz=50_000):
    settings = SingleCarrier(
        constellation=Constellation.parse("16qam"), symbol_rate_hz=Fraction(symbol_rate_hz)
    )
    return settings.build(site(path))


def add(signals, **keys):
    """Sum signals at the offsets, levels and phases given for each."""
    parts = tuple(
        Part(signal=None, **{name: values[i] for name, values in keys.items()})
        for i in range(len(signals))
    )
    return Sum(parts=parts).combine(site(), signals)


@pytest.fixture(scope="module")
def composite():
    """Two carriers in a sum, one of which stands in a delayed sum with a tone."""
    tone = Carrier().build(site("tone"))
    inner = add(
        [carrier("a"), tone],
        frequency_offset_hz=[Fraction(100_000), Fraction(-300_000)],
        level_db=[0.0, -6.0],
        phase_deg=[20.0, 0.0],
    )
    inner = Delay(delay=TimeSpan.parse("12.25 samples")).build(site(), inner)
    return add(
        [inner, carrier("b")],
        frequency_offset_hz=[Fraction(50_000), Fraction(-100_000)],
        level_db=[-3.0, 0.0],
        phase_deg=[0.0, -77.0],
    )


def errors_percent(graph, conditioned=None):
    """Unfitted: level, phase, delay and frequency must all be right."""
    found = {}
    for located in locate_sources(graph, conditioned):
        if located.has_symbols:
            reception = located.reception()
            got = samples_of(reception.received).astype(complex)
            sent = samples_of(reception.ideal).astype(complex)
            error = np.mean(np.abs(got - sent) ** 2) / np.mean(np.abs(sent) ** 2)
            found[located.path] = 100 * np.sqrt(error)
    return found


def test_paths_and_kinds(composite) -> None:
    located = locate_sources(composite)
    assert [item.path for item in located] == ["parts[0].parts[0]", "parts[0].parts[1]", "parts[1]"]
    assert [item.has_symbols for item in located] == [True, False, True]
    assert not any(item.is_alone for item in located)
    with pytest.raises(SignalError) as caught:
        located[1].reception()
    assert caught.value.where == "parts[0].parts[1]"


STAGES = {
    "none": [],
    "whole delay": [Delay(delay=TimeSpan.parse("7 samples"))],
    "delay": [Delay(delay=TimeSpan.parse("-3.6 samples"))],
    "level": [Scale(gain_db=-11.0)],
    "band": [Filter(bandwidth_hz=Fraction(900_000))],
    "late taps": [Filter(taps=FilterTaps.parse([0, 0, 0, 1]))],
    "late off taps": [Filter(taps=FilterTaps.parse([0, 0, 1, 0]))],
    "high ceiling": [Clip(ceiling_db=20.0)],
    "several": [
        Scale(gain_db=3.0),
        Delay(delay=TimeSpan.parse("1.5 samples")),
        Filter(bandwidth_hz=Fraction(900_000)),
    ],
}


@pytest.mark.parametrize("case", STAGES)
def test_symbols_come_back_through_stages_that_keep_time(composite, case) -> None:
    """Below 0.01 % each, the carriers being apart by more than their bands."""
    signal = composite
    for stage in STAGES[case]:
        signal = stage.build(site("stages[0]"), signal)
    found = errors_percent(signal)
    assert set(found) == {"parts[0].parts[0]", "parts[1]"}
    assert max(found.values()) < 0.01


@pytest.mark.parametrize("ratio", [Fraction(2), Fraction(3, 2), Fraction(4, 5)])
def test_through_a_change_of_rate(composite, ratio) -> None:
    late = Delay(delay=TimeSpan.parse("2.5 samples")).build(site(), composite)
    there = site(n=int(N * ratio), rate=RATE_HZ * ratio)
    signal = Resample(input_rate_hz=RATE_HZ).build(there, late)
    signal = Delay(delay=TimeSpan.parse("-4.7 samples")).build(there, signal)
    assert max(errors_percent(signal).values()) < 0.01


def test_half_sample_delays_of_even_filters_are_followed(composite) -> None:
    signal = Filter(taps=FilterTaps.parse([0.5, 0.5])).build(site(), composite)
    (first, *_) = locate_sources(signal)
    assert first.arrival.delay_samples == Fraction(49, 4) + Fraction(1, 2)
    assert not first.arrival.remarks


def test_filters_without_one_delay_are_remarked(composite) -> None:
    signal = Filter(taps=FilterTaps.parse([1.0, 0.3])).build(site(), composite)
    (first, *_) = locate_sources(signal)
    assert "delay" in first.arrival.remarks[0]
    assert first.arrival.delay_samples == Fraction(49, 4)


def test_what_was_received_may_be_given(composite, held) -> None:
    samples = samples_of(composite)
    assert max(errors_percent(composite, held(samples)).values()) < 0.01
    with pytest.raises(SignalError):
        locate_sources(composite, held(samples[:-1]))


def test_a_gate_is_refused(composite) -> None:
    gate = Gate(pattern="10", slot=TimeSpan.parse("100 samples"))
    with pytest.raises(SignalError):
        locate_sources(gate.build(site(), composite))


def test_a_source_alone() -> None:
    (only,) = locate_sources(carrier("a"))
    assert only.path == "signal"
    assert only.is_alone
