from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Cycle
from wavegen.core.timespan import TimeSpan
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.stages.chain import build_chain, chain_cycle, rates_of, source_site
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.channel.resample import Resample
from wavegen.stages.channel.scale import Scale

RATE = Fraction(1_000_000)
UP = Resample(input_rate_hz=Fraction(750_000))
DOWN = Resample(input_rate_hz=Fraction(1_200_000))
GATE = Gate(pattern="110", slot=TimeSpan.parse("25 us"))
LEVEL = Scale(gain_db=-3.0)


def test_rates_go_back_from_the_end():
    assert rates_of([], RATE) == [RATE]
    assert rates_of([LEVEL, GATE], RATE) == [RATE] * 3
    assert rates_of([LEVEL, UP, GATE, DOWN], RATE) == [
        Fraction(750_000),
        Fraction(750_000),
        Fraction(1_200_000),
        Fraction(1_200_000),
        RATE,
    ]


@pytest.mark.parametrize(
    ("stages", "source", "want"),
    [
        ([], Cycle(n_samples=7, n_symbols=2), Cycle(n_samples=7, n_symbols=2)),
        ([LEVEL], Cycle(n_samples=7), Cycle(n_samples=7)),
        ([GATE], Cycle(n_samples=4, n_symbols=1), Cycle(n_samples=300, n_symbols=75)),
        ([UP], Cycle(n_samples=5, n_symbols=1), Cycle(n_samples=20, n_symbols=3)),
        ([DOWN], Cycle(n_samples=12, n_symbols=4), Cycle(n_samples=10, n_symbols=4)),
        ([UP], Cycle(n_samples=1), Cycle(n_samples=4)),
    ],
)
def test_cycle_is_whole_for_all(stages, source, want):
    assert chain_cycle(source, stages, RATE, "stages") == want


@pytest.mark.parametrize(
    "stages", [[UP], [DOWN], [UP, GATE], [GATE, DOWN], [DOWN, UP, LEVEL], [UP, GATE, DOWN]]
)
@pytest.mark.parametrize("n_source", [1, 7, 12, 30])
def test_cycle_is_the_shortest(stages, n_source):
    """Searched for: the first loop that is whole at every rate, for the source and every gate."""
    got = chain_cycle(Cycle(n_samples=n_source), stages, RATE, "stages").n_samples
    rates = rates_of(stages, RATE)

    def fits(n):
        lengths = [n * rate / RATE for rate in rates]
        gates = [
            75 * rate / RATE if stage is GATE else 1
            for stage, rate in zip(stages, rates[1:], strict=True)
        ]
        periods = [n_source, *gates]
        return all(
            (n / period).denominator == 1 for n, period in zip(lengths, periods, strict=True)
        )

    assert fits(got)
    assert not any(fits(n) for n in range(1, got) if got % n == 0)


def test_the_site_of_the_source_has_its_rate_and_loop(bench):
    site = source_site([UP, GATE], bench.site(400))
    assert (site.sample_rate_hz, site.n_samples) == (Fraction(750_000), 300)
    with pytest.raises(RecipeError) as caught:
        source_site([UP], bench.site(402))
    assert caught.value.where == "stages[0]"


def test_stages_are_built_in_order_at_their_rates(bench):
    stages = [LEVEL, UP, GATE]
    end = bench.site(1200)
    before = source_site(stages, end)
    source = replace(bench.gaussian(before.n_samples), sample_rate_hz=before.sample_rate_hz)
    signal = build_chain(stages, end, source, "stages")
    by_hand = GATE.build(end, UP.build(end, LEVEL.build(before, source)))
    assert samples_of(signal).tobytes() == samples_of(by_hand).tobytes()
    assert (signal.sample_rate_hz, signal.n_samples) == (RATE, 1200)
    assert on_time(signal) == by_hand.gate


def test_complaints_name_the_stage(bench):
    with pytest.raises(RecipeError) as caught:
        build_chain([LEVEL, GATE], bench.site(100), bench.gaussian(100), "signal.parts[1].stages")
    assert caught.value.where == "signal.parts[1].stages[1].slot"
    third = Gate(pattern="10", slot=TimeSpan.parse("1/3 us"))
    with pytest.raises(RecipeError) as caught:
        chain_cycle(Cycle(n_samples=1), [LEVEL, third], RATE, "stages")
    assert caught.value.where == "stages[1].slot"


def test_notes_and_label_are_those_of_the_site(bench):
    seen = []

    class Looks:
        def build(self, site, source):
            seen.append(site)
            return source

    end = bench.site(400)
    build_chain([Looks(), UP], end, replace(bench.gaussian(300), sample_rate_hz=750_000), "stages")
    assert seen[0].notes is end.notes
    assert (seen[0].label, seen[0].path) == (end.label, "stages[0]")
    assert (seen[0].sample_rate_hz, seen[0].n_samples) == (Fraction(750_000), 300)


def test_a_carrier_through_gate_and_rates_loops(bench):
    carrier = SingleCarrier(
        constellation=Constellation.parse("qpsk"), symbol_rate_hz=Fraction(150_000)
    )
    stages = [UP, GATE]
    before = rates_of(stages, RATE)[0]
    cycle = chain_cycle(carrier.cycle(before, "signal"), stages, RATE, "stages")
    assert (cycle.n_samples, cycle.n_symbols) == (300, 45)
    end = bench.site(5 * cycle.n_samples, "signal")
    signal = build_chain(stages, end, carrier.build(source_site(stages, end)), "stages")
    samples = samples_of(signal)
    assert samples_of(signal, -7, 1493).tobytes() == np.roll(samples, 7).tobytes()
    assert signal.mean_power == pytest.approx(2 / 3)
