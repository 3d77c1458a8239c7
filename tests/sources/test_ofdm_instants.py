import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.laws.term import NoLaw
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Ofdm
from wavegen.sources.ofdm_carriers import Carriers
from wavegen.sources.ofdm_instants import Instants, law_of_instants
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.ofdm_moments import Moments
from wavegen.sources.ofdm_parts import Group, Pilots
from wavegen.sources.subcarriers import IndexSet, PilotValues

QPSK = np.exp(0.5j * np.pi * (np.arange(4) + 0.5))
T = np.linspace(0.2, 9, 12)


def carriers_of(count, n_fft, points=QPSK):
    return Carriers(
        turns=np.arange(count) / n_fft,
        phases=np.zeros(count),
        points=np.asarray(points) / math.sqrt(count * np.mean(np.abs(points) ** 2)),
    )


def instants_of(carriers, n_fft):
    moments = Moments(
        sources=((0, 1.0),), starts=np.zeros(1, np.int64), low=0, high=n_fft, known=None
    )
    return Instants.of([moments], [(carriers,)], n_fft=n_fft, span=carriers.turns.size)


def test_samples_that_look_alike_are_gone_through_once():
    # A quarter turn and the mirror image: 0 ... 8 of 64.
    found = instants_of(carriers_of(10, 64), 64)
    assert found.weights.size == 9
    assert found.weights.sum() == pytest.approx(1)
    # 8PSK too; BPSK repeats after half a turn; what crowds is thinned out, but for the 32 samples
    # about a lattice.
    assert instants_of(carriers_of(10, 64, [1, -1]), 64).weights.size == 17
    assert instants_of(carriers_of(10, 4096), 4096).weights.size == 17 + 16


def test_the_average_is_that_of_every_sample():
    n_fft, carriers = 64, carriers_of(10, 64)
    angle = np.arange(256) * (2 * np.pi / 256)
    want = np.mean([carriers.factor(T, angle, n, 1.0).mean(axis=1) for n in range(n_fft)], axis=0)
    assert instants_of(carriers, n_fft).characteristic(T) == pytest.approx(want, abs=1e-12)


def enumerated(count, n_fft, points, n_samples):
    """All sums that begin with the first point, at some samples; powers falling."""
    powers = []
    for n in range(n_samples):
        x = np.array([points[0]], complex)
        for k in range(1, count):
            x = np.add.outer(x, points * np.exp(2j * np.pi * k * n / n_fft)).ravel()
        powers.append(np.abs(x) ** 2 / (count * np.mean(np.abs(points) ** 2)))
    return np.sort(np.concatenate(powers))[::-1]


def test_ten_qpsk_subcarriers_by_enumeration():
    """All 4^9 symbols that begin with one phase, at all different samples: exact."""
    instants = instants_of(carriers_of(10, 64), 64)
    law = law_of_instants(instants, name="ten", peak=math.sqrt(10))
    power = enumerated(10, 64, QPSK, 16)
    for probability in (0.1, 0.01, 1e-3, 1e-5):
        exact_db = 10 * math.log10(power[int(probability * power.size)])
        assert float(law.level_db(probability)) == pytest.approx(exact_db, abs=1e-4)


@pytest.mark.parametrize(("count", "points"), [(3, QPSK), (6, QPSK), (8, np.array([1.0, -1.0]))])
def test_few_sums_are_counted(count, points):
    instants = instants_of(carriers_of(count, 32, points), 32)
    assert len(instants.exact) == instants.weights.size
    law = law_of_instants(instants, name="few", peak=math.sqrt(count))
    power = enumerated(count, 32, points, 32)
    for level_db in (-20.0, -6.1, 0.1, 2.0, 3.3, 4.4):
        want = np.mean(power > 10 ** (level_db / 10))
        assert float(law.ccdf(level_db)) == pytest.approx(want, abs=1e-12)
    assert law.lowest_probability == 0


def shares_above(instants, count, n_fft, edges_db):
    """Shares of all sums of QPSK that begin with one phase above levels, at every sample."""
    edges = count * 10 ** (edges_db / 10)
    above, total = np.zeros(edges.shape), 0.0
    for (source,), weight in zip(instants.sources, instants.weights, strict=True):
        first, second = QPSK[:1], np.zeros(1, complex)
        for k in range(1, count):
            turned = QPSK * np.exp(2j * np.pi * k * source[2] / n_fft)
            if k < 7:
                first = np.add.outer(first, turned).ravel()
            else:
                second = np.add.outer(second, turned).ravel()
        for some in np.array_split(first, 64):
            power = np.sort(np.abs(np.add.outer(some, second).ravel()) ** 2)
            above += weight * (power.size - np.searchsorted(power, edges, side="right"))
        total += weight * first.size * second.size
    return above / total


def test_thirteen_qpsk_subcarriers_by_enumeration():
    """All 4^12 symbols that begin with one phase; four of nine samples are rounded off."""
    instants = instants_of(carriers_of(13, 64), 64)
    assert len(instants.exact) == 5 < instants.weights.size
    law = law_of_instants(instants, name="13", peak=math.sqrt(13))
    assert law.lowest_probability <= 1e-3
    asked = np.array([0.1, 0.03, 0.01, 3e-3, 1e-3])
    around = law.level_db(asked)[:, None] + np.array([-1e-3, 1e-3])
    above = shares_above(instants, 13, 64, around)
    assert np.all(above[:, 0] > asked)
    assert np.all(above[:, 1] < asked)


def test_tables_round_the_circle_give_what_each_subcarrier_gives():
    # Turned groups stand between the steps of the angles: computed one by one.
    for phases in (np.zeros(5), np.full(5, np.pi / 8), np.arange(5) * 0.3):
        carriers = Carriers(turns=np.arange(5) / 32 + 1 / 64, phases=phases, points=QPSK / 2)
        instants = instants_of(carriers, 32)
        angle = np.arange(256) * (2 * np.pi / 256)
        for number, ((_, gain, sample),) in enumerate(instants.sources):
            want = carriers.factor(T, angle, sample, gain).mean(axis=1).real
            assert instants.characteristic(T, [number]) == pytest.approx(
                instants.weights[number] * want, abs=1e-12
            )


def fourteen():
    return instants_of(carriers_of(14, 64), 64)


def test_twelve_qpsk_subcarriers_by_enumeration():
    """All 4^11 symbols that begin with one phase, at every sample: one resource block."""
    instants = instants_of(carriers_of(12, 32), 32)
    law = law_of_instants(instants, name="twelve", peak=math.sqrt(12))
    assert law.lowest_probability == 0
    asked = np.array([0.1, 0.03, 0.01, 1e-3, 1e-5])
    around = law.level_db(asked)[:, None] + np.array([-5e-4, 5e-4])
    above = shares_above(instants, 12, 32, around)
    assert np.all(above[:, 0] > asked)
    assert np.all(above[:, 1] <= asked)


def test_a_law_speaks_as_far_down_as_it_is_sure():
    sure, surer = (
        law_of_instants(fourteen(), name="14", peak=math.sqrt(14), accuracy_db=x)
        for x in (0.001, 1.0)
    )
    assert sure.lowest_probability > surer.lowest_probability == 0
    pattern = law_of_instants(
        fourteen(), name="14", peak=math.sqrt(14), accuracy_db=1.0, lowest_probability=1e-2
    )
    assert pattern.lowest_probability == 1e-2


def test_lattices_have_no_law():
    found = law_of_instants(fourteen(), name="14", peak=math.sqrt(14), accuracy_db=1e-6)
    assert isinstance(found, NoLaw)
    assert "lattices" in found.reason


def test_36_subcarriers_with_prefix_edge_and_pilots_in_a_recipe():
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-18..-1, 1..18"),
                constellation=Constellation.parse("qpsk"),
            ),
        ),
        pilots=(Pilots(subcarriers=IndexSet.parse("19..21"), values=PilotValues.parse([1, -1])),),
        cyclic_prefix=CyclicPrefix.parse("8 samples"),
        edge_window=Stretch.parse("4 samples"),
    )
    site = Site(sample_rate_hz=Fraction(15000) * 64, n_samples=72, seed=1, label="a", path="signal")
    law = settings.law(site)
    assert not isinstance(law, NoLaw), law.reason
    assert isinstance(settings.term(site), NoLaw)
    rng = np.random.default_rng(5)
    n = 40_000
    grid = np.zeros((n + 1, 64), complex)
    used = np.r_[-18:0, 1:19]
    grid[:, used] = QPSK[rng.integers(4, size=(n + 1, 36))]
    grid[:, [19, 20, 21]] = (1, -1, 1)
    body = np.fft.ifft(grid, axis=1) * 64
    symbol = np.concatenate((body[:, -8:], body), axis=1)
    w = 0.5 - 0.5 * np.cos(np.pi * (np.arange(4) + 0.5) / 4)
    symbol[1:, :4] = w * symbol[1:, :4] + (1 - w) * body[:-1, :4]
    power = np.abs(symbol[1:]) ** 2
    power /= power.mean()
    for level_db in (-10.0, 0.0, 4.0, 7.0, 8.5):
        want = float(law.ccdf(level_db))
        by_symbol = (power > 10 ** (level_db / 10)).mean(axis=1)
        sigma = by_symbol.std() / math.sqrt(n)
        # Below the mean the lattices at 4 samples of 64 show: 1 % of their probability.
        assert by_symbol.mean() == pytest.approx(want, abs=4 * sigma + 1e-3 * (level_db < 0))
