from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.index_set import IndexSet, SymbolSet
from wavegen.core.render import samples_of
from wavegen.core.symbol_bodies import HasBodies
from wavegen.core.units import QuantityError
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group
from wavegen.stages.channel.gate import on_time
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.crest.projection import Projection
from wavegen.stages.passband import Passband

N = 1 << 15


@pytest.fixture(scope="module")
def source(reduction):
    return reduction.banded(N, (-0.1, 0.1, 0))


@pytest.mark.parametrize("rounds", [1, 5, 20])
@pytest.mark.parametrize("ceiling_db", [4.0, 7.0])
def test_the_ceiling_holds_at_every_sample_for_any_rounds(reduction, source, ceiling_db, rounds):
    signal, _ = reduction.build(Projection(ceiling_db=ceiling_db, rounds=rounds), source)
    samples = samples_of(signal)
    # The solver stops at 0.001 dB; roundings are 5e-7.
    assert reduction.papr_db(samples) == pytest.approx(ceiling_db, abs=0.004)
    highest = np.max(np.abs(samples.astype(np.complex128)))
    assert highest <= signal.amplitude * signal.gain * (1 + 6e-7)


@pytest.mark.parametrize("bands", [[(-0.1, 0.1)], [(-0.2, -0.12), (0.05, 0.15)]])
def test_out_of_band_is_unchanged(reduction, bands):
    source = reduction.banded(N, *((low, high, 0) for low, high in bands))
    signal, _ = reduction.build(Projection(ceiling_db=5.5, rounds=20), source)
    edge = 0.02  # of the filter, and of the last gain
    wide = [(low - edge, high + edge) for low, high in bands]
    assert reduction.change_dbc(signal, source, wide) < -100


def test_no_other_method_has_less_error_under_the_same_peak(reduction, source):
    """Rounds of clip and filter end near the optimum, on the far side of it."""
    near, _ = reduction.build(ClipFilter(ceiling_db=5.9, rounds=24), source)
    peak_db = reduction.papr_db(samples_of(near))
    best, _ = reduction.build(Projection(ceiling_db=peak_db, rounds=60), source)
    assert reduction.evm_percent(best, source) < reduction.evm_percent(near, source)


def test_mean_power_is_kept(reduction, source):
    signal, notes = reduction.build(Projection(ceiling_db=4.0, rounds=10), source)
    power = np.abs(samples_of(signal).astype(np.complex128)) ** 2
    assert power.mean() == pytest.approx(1, rel=1e-5)
    (note,) = [note for note in notes if note.where.endswith("ceiling")]
    assert "10 rounds" in note.text
    assert f"{-20 * np.log10(signal.gain):.4f} dB" in note.text


@pytest.mark.parametrize(("half_width", "n_rounds"), [(0.1, 35), (0.0625, 56)])
def test_rounds_follow_the_band(reduction, bench, half_width, n_rounds):
    """The ceiling is within 0.02 dB of that which 200 rounds reach with the same error."""
    source = reduction.banded(N, (-half_width, half_width, 0))
    edge = Fraction(half_width) * bench.rate_hz
    band = {"passbands": (Passband(low_hz=-edge, high_hz=edge),)}
    signal, notes = reduction.build(Projection(ceiling_db=6.0, **band), source)
    assert f"projects in {n_rounds} rounds" in notes[-1].text
    best, _ = reduction.build(Projection(ceiling_db=5.98, rounds=200, **band), source)
    # The pilot stops at 0.001 dB of both ceilings, at 5.4 dB of error over 1 dB of ceiling.
    slack = 10 ** (2 * 5.4 * 0.001 / 20)
    found, wanted = (reduction.evm_percent(each, source) for each in (signal, best))
    assert found < wanted * slack


def test_it_is_on_when_its_source_is(reduction, bench):
    gated = bench.given([1, 1, 1j, -1, 0, 0, 0, 0], n_samples=64)
    assert on_time(gated) is None
    source = reduction.banded(N, (-0.1, 0.1, 0))
    signal, _ = reduction.build(Projection(ceiling_db=6.0, rounds=3), source)
    held, corrected = signal, signal.inputs[0]
    assert corrected.acts_on is source
    assert on_time(held) is None  # no gate anywhere, and no error on the way


def test_a_low_peak_is_left(reduction, source):
    ceiling_db = reduction.papr_db(source.samples) + 0.01
    assert reduction.build(Projection(ceiling_db=ceiling_db), source)[0] is source


@pytest.fixture(scope="module")
def symbols(ofdm):
    return ofdm.build("-32..-1, 1..32", "64qam")


@pytest.mark.parametrize("rounds", [1, 6, 20])
@pytest.mark.parametrize("ceiling_db", [4.5, 7.0])
def test_the_ceiling_of_symbols_holds_behind_prefix_and_window(
    ofdm, reduction, symbols, ceiling_db, rounds
):
    """Edges that overlap are means of two symbols: no sample of theirs stands higher."""
    signal, notes = ofdm.reduce(Projection(ceiling_db=ceiling_db, rounds=rounds), symbols)
    samples = samples_of(signal)
    assert reduction.papr_db(samples) == pytest.approx(ceiling_db, abs=0.004)
    bodies = signal.bodies
    assert np.max(np.abs(samples)) <= bodies.amplitude * bodies.gain * (1 + 6e-7)
    assert np.mean(np.abs(samples.astype(np.complex128)) ** 2) == pytest.approx(
        np.mean(np.abs(samples_of(symbols).astype(np.complex128)) ** 2), rel=1e-5
    )
    (note,) = [note for note in notes if note.where.endswith("ceiling")]
    assert f"projects symbols in {rounds} rounds" in note.text
    assert f"{reduction.papr_db(samples):.2f} dB at the peak there" in note.text


def test_symbols_change_on_their_subcarriers_only(ofdm, symbols):
    signal, _ = ofdm.reduce(Projection(ceiling_db=5.0), symbols)
    bins = ofdm.bins(signal)
    total = np.sum(np.abs(bins) ** 2)
    bins[:, symbols.grid.indices] = 0
    assert 10 * np.log10(np.sum(np.abs(bins) ** 2) / total) < -120


def test_scheduled_symbols_change_where_they_are_on(ofdm):
    parts = {"subcarriers": IndexSet.parse("-32..-1"), "constellation": Constellation.parse("qpsk")}
    others = parts | {"subcarriers": IndexSet.parse("1..32")}
    groups = (
        Group(**parts, symbols=SymbolSet.parse("0, 1")),
        Group(**others, symbols=SymbolSet.parse("1, 2")),
    )
    source = ofdm.build("0", groups=groups, frame_symbols=4)
    bins = ofdm.bins(ofdm.reduce(Projection(ceiling_db=5.0, rounds=8), source)[0])
    assert np.max(np.abs(bins[0::4, 1:128])) < 1e-5
    assert np.max(np.abs(bins[2::4, 128:])) < 1e-5
    assert not bins[3::4].any()
    assert np.min(np.abs(bins[1::4, 1:33])) > 1e-3


def test_which_of_both_it_acts_on(ofdm, symbols):
    band = (Passband(low_hz=Fraction(-130_000), high_hz=Fraction(130_000)),)
    for settings, is_symbols in (
        (Projection(ceiling_db=6.0, rounds=2), True),
        (Projection(ceiling_db=6.0, rounds=2, passbands=band), False),
        (Projection(ceiling_db=6.0, rounds=2, transition_hz=Fraction(20_000)), False),
        (Projection(ceiling_db=6.0, rounds=2, acts_on="waveform"), False),
    ):
        signal, _ = ofdm.reduce(settings, symbols)
        assert isinstance(signal, HasBodies) == is_symbols
    with pytest.raises(QuantityError) as caught:
        Projection(ceiling_db=6.0, passbands=band, acts_on="symbols")
    assert caught.value.key == "passbands"
