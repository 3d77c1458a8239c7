import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.index_set import IndexSet, SymbolSet
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.dsp.arrival import Arrival
from wavegen.meters.evm_probe import measure_evm
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Pilots
from wavegen.sources.subcarriers import PilotValues
from wavegen.stages.channel.delay import Delay
from wavegen.stages.crest.selected_mapping import SelectedMapping, chosen
from wavegen.stages.crest.tone_reservation import ToneReservation


@pytest.fixture(scope="module")
def source(ofdm):
    return ofdm.build("-32..-1, 1..32", n_symbols=64)


def peaks_of(bins, times=4):
    """Return the highest power of each symbol on a finer grid, by transforms of the test's own."""
    n = bins.shape[1]
    wide = np.zeros((bins.shape[0], n * times), np.complex128)
    wide[:, : n // 2], wide[:, -n // 2 :] = bins[:, : n // 2], bins[:, n // 2 :]
    return np.max(np.abs(np.fft.ifft(wide, axis=1) * n * times) ** 2, axis=1)


def test_the_candidate_with_the_lowest_peak_is_taken(ofdm, source):
    signal, _ = ofdm.reduce(SelectedMapping(candidates=6), source)
    used = source.grid.indices
    bins = ofdm.bins(source)
    candidates = []
    for factors in signal.bodies.sequences.factors:
        turned = bins.copy()
        turned[:, used] *= factors
        candidates.append(peaks_of(turned, 1))
    choice = chosen(signal.bodies.choice)
    assert np.array_equal(choice, np.argmin(candidates, axis=0))
    assert set(choice.tolist()) == set(range(6))
    got = peaks_of(ofdm.bins(signal), 1)
    assert got == pytest.approx(np.min(candidates, axis=0), rel=1e-4)
    assert np.array_equal(chosen(signal.bodies.choice, 60, 70), np.r_[choice, choice][60:70])


def test_sequences_are_quarter_turns_that_a_receiver_knows(ofdm, source):
    first, _ = ofdm.reduce(SelectedMapping(candidates=4), source)
    factors = first.bodies.sequences.factors
    assert np.all(factors[0] == 1)
    assert set(np.unique(factors[1:]).tolist()) == {1, 1j, -1, -1j}
    more, _ = ofdm.reduce(SelectedMapping(candidates=8), source)
    assert np.array_equal(more.bodies.sequences.factors[:4], factors)


def test_the_receiver_turns_back(ofdm, source):
    signal, notes = ofdm.reduce(SelectedMapping(candidates=8), source)
    (result,) = measure_evm(signal)
    assert result.percent < 1e-3
    assert result.overall.unfitted_percent < 1e-3
    untold = signal.with_bodies(signal.bodies)
    object.__setattr__(untold, "undone_by", ())
    assert measure_evm(untold)[0].percent > 100
    assert any("3 bits of side information" in note.text for note in notes)
    late, _ = ofdm.reduce(Delay(delay=TimeSpan.parse("37 samples")), signal)
    assert measure_evm(late)[0].percent < 1e-3


def test_mean_power_stays_and_the_peaks_told_are_those(ofdm, source):
    signal, notes = ofdm.reduce(SelectedMapping(candidates=8), source)
    mean = np.mean(np.sum(np.abs(ofdm.bins(source)) ** 2, axis=1))
    for each, word in ((source, "before"), (signal, "10 % peak above")):
        level = 10 * np.log10(np.quantile(peaks_of(ofdm.bins(each), 1), 0.9) / mean)
        assert f"{level:.2f} dB" in notes[-1].text, word
    power = np.sum(np.abs(ofdm.bins(signal)) ** 2, axis=1)
    assert power == pytest.approx(np.sum(np.abs(ofdm.bins(source)) ** 2, axis=1), rel=1e-5)


def test_pilots_spread_groups_and_silent_symbols(ofdm):
    qpsk = Constellation.parse("qpsk")
    source = ofdm.build(
        "0",
        groups=(
            Group(
                subcarriers=IndexSet.parse("-32..-1"),
                constellation=qpsk,
                symbols=SymbolSet.parse("0"),
                spreading="dft",
            ),
            Group(
                subcarriers=IndexSet.parse("-16..-1"),
                constellation=qpsk,
                symbols=SymbolSet.parse("1"),
            ),
        ),
        pilots=(
            Pilots(
                subcarriers=IndexSet.parse("-20..-17, 1..4"),
                values=PilotValues.parse([1, -1, [0, 1]]),
                symbols=SymbolSet.parse("1"),
            ),
        ),
        frame_symbols=3,
        half_subcarrier_shift=True,
    )
    signal, _ = ofdm.reduce(SelectedMapping(candidates=4), source)
    choice = chosen(signal.bodies.choice)
    assert not choice[2::3].any()
    assert choice[::3].any()
    assert choice[1::3].any()
    (result,) = measure_evm(signal)
    assert result.percent < 1e-3
    reception = signal.receive(signal, Arrival(n_samples=signal.n_samples))
    points = reception.spread.reception(reception.received)
    got, want = samples_of(points.received), samples_of(points.ideal)
    assert np.max(np.abs(got - want)) < 1e-4 * np.max(np.abs(want))
    turn = np.exp(-1j * np.pi * np.arange(256) / 256)
    rows = [samples_of(each.bodies).reshape(-1, 256) * turn for each in (source, signal)]
    first, second = (np.fft.fft(each, axis=1)[1::3][:, np.r_[-20:-16, 1:5]] for each in rows)
    assert np.allclose(first, second, atol=1e-3)


def test_other_methods_on_symbols_follow(ofdm, reduction):
    source = ofdm.build("-32..-20, -18..-1, 1..8, 10..32")
    turned, _ = ofdm.reduce(SelectedMapping(candidates=4), source)
    signal, _ = ofdm.reduce(ToneReservation(ceiling_db=6.5, count=2), turned)
    assert reduction.papr_db(samples_of(signal)) < reduction.papr_db(samples_of(turned))
    assert measure_evm(signal)[0].percent < 1e-3


def test_pilots_alone_cannot_be_turned(ofdm):
    pilots = Pilots(subcarriers=IndexSet.parse("1..9"), values=PilotValues.parse([1, -1]))
    source = ofdm.build("0", groups=(), pilots=(pilots,))
    with pytest.raises(RecipeError) as caught:
        ofdm.reduce(SelectedMapping(candidates=2), source)
    assert "no data" in caught.value.problem
