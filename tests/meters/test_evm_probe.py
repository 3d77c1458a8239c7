from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.meters.evm_errors import equalised
from wavegen.meters.evm_probe import EvmSettings, measure_evm, probes_of
from wavegen.sources.carrier import Carrier
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.sources.subcarriers import IndexSet, PilotValues
from wavegen.stages.channel.filter import Filter, FilterTaps
from wavegen.stages.crest.clip import Clip

N_FFT = 256
RATE_HZ = Fraction(15_000) * N_FFT
N_SYMBOLS = 60


def site(n=N_SYMBOLS * (N_FFT + 16)):
    return Site(sample_rate_hz=RATE_HZ, n_samples=n, seed=1, label="x", path="signal")


@pytest.fixture(scope="module")
def ofdm():
    return build()


def build(spreading=None, edge="0 samples"):
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15_000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-40..-5"),
                constellation=Constellation.parse("64qam"),
                spreading=spreading,
            ),
            Group(
                subcarriers=IndexSet.parse("5..40"),
                constellation=Constellation.parse("qpsk"),
                level_db=3.0,
            ),
        ),
        pilots=(Pilots(subcarriers=IndexSet.parse("-2, 2"), values=PilotValues.parse([1, -1])),),
        cyclic_prefix=CyclicPrefix.parse("16 samples"),
        edge_window=Stretch.parse(edge),
    )
    return settings.build(site())


def clipped(signal, ceiling_db=6.0):
    return Clip(ceiling_db=ceiling_db).build(site(), signal)


DEFINITIONS = {
    "gain_fitted": {},
    "zero_forcing": {},
    "3gpp": {"window_samples": 8},
    "802.11": {"frame_symbols": 20},
}


def settings(definition, **others):
    return EvmSettings(definition=definition, **DEFINITIONS[definition], **others)


@pytest.mark.parametrize("definition", DEFINITIONS)
def test_untouched_is_at_the_floor_by_every_definition(ofdm, definition) -> None:
    (found,) = measure_evm(ofdm, settings=settings(definition))
    assert found.percent < 1e-4
    assert found.definition == definition
    assert found.path == "signal"
    assert not found.remarks


def test_figures_agree_with_the_symbols(ofdm) -> None:
    signal = clipped(ofdm)
    reception = probes_of(signal)[0].receptions[0]
    got = samples_of(reception.received).astype(complex)
    sent = samples_of(reception.ideal).astype(complex)
    gain = np.vdot(sent, got) / np.vdot(sent, sent)
    labels = np.resize(reception.labels.ravel(), sent.size)
    (found,) = measure_evm(signal, settings=EvmSettings(has_spread=True, limits="NR BS FR1"))
    for number, figures in enumerate(found.classes):
        s, error = sent[labels == number], (got / gain - sent)[labels == number]
        rms = np.sqrt(np.mean(np.abs(s) ** 2))
        length = 100 * np.abs(error) / rms
        assert figures.percent == figures.fitted_percent
        assert figures.percent == pytest.approx(np.sqrt(np.mean(length**2)), rel=1e-4)
        assert figures.spread.peak_percent == pytest.approx(length.max(), rel=1e-4)
        # bins of 0.0085 dB, and one place more or less
        assert figures.spread.p95_percent == pytest.approx(np.percentile(length, 95), rel=0.02)
        assert figures.spread.median_percent == pytest.approx(np.median(length), rel=0.02)
    assert [item.limit_percent for item in found.classes] == [8, 17.5, None]
    assert found.is_kept
    everything = np.sum(np.abs(got / gain - sent) ** 2) / np.sum(np.abs(sent) ** 2)
    assert found.percent == pytest.approx(100 * np.sqrt(everything), rel=1e-5)
    assert found.gain_db == pytest.approx(20 * np.log10(abs(gain)), abs=1e-5)
    assert len(found.table().rows) == 4
    assert len(found.rows()) == 4


def test_an_equaliser_undoes_what_a_filter_does(ofdm) -> None:
    """A filter shorter than the prefix is one gain for each subcarrier."""
    taps = FilterTaps.parse([1.0, [0.2, 0.1], 0.0, -0.1])
    signal = Filter(taps=taps).build(site(), ofdm)
    (plain,) = measure_evm(signal)
    assert plain.percent > 5
    assert plain.overall.equalised_percent < 1e-3
    assert "delay" in plain.remarks[0]
    (forced,) = measure_evm(signal, settings=settings("zero_forcing", has_spread=True))
    assert forced.percent == plain.overall.equalised_percent
    assert forced.classes[0].spread.peak_percent < 1e-2


def test_the_worse_of_two_timings_counts() -> None:
    """Of a prefix of 16 the edge takes 8: timings 8 + 1 and 8 + 7 before the useful part."""
    signal = build(edge="8 samples")
    inside, narrow, wide = (
        measure_evm(signal, settings=EvmSettings(definition="3gpp", window_samples=window))[0]
        for window in (1, 2, 14)
    )
    assert inside.percent < 1e-4
    assert 0.01 < narrow.percent < 1
    assert wide.percent > 5
    with pytest.raises(SignalError):
        measure_evm(signal, settings=EvmSettings(definition="3gpp", window_samples=40))


def test_spread_groups_are_judged_at_their_points() -> None:
    signal = clipped(build("dft"))
    probe = probes_of(signal)[0]
    reception = probe.receptions[0]
    points = reception.spread.reception(reception.received)
    got = samples_of(points.received).astype(complex)
    sent = samples_of(points.ideal).astype(complex)
    labels = np.resize(points.labels.ravel(), sent.size)
    (found,) = measure_evm(signal, settings=EvmSettings(has_spread=True))
    gain = 10 ** (found.gain_db / 20) * np.exp(1j * np.radians(found.phase_deg))
    error = np.abs(got / gain - sent)[labels == 0]
    rms = np.sqrt(np.mean(np.abs(sent[labels == 0]) ** 2))
    # the transform is unitary: RMS figures of subcarriers are those of points
    assert found.classes[0].percent == pytest.approx(
        100 * np.sqrt(np.mean(error**2)) / rms, rel=1e-4
    )
    assert found.classes[0].spread.peak_percent == pytest.approx(100 * error.max() / rms, rel=1e-4)
    assert found.classes[2].spread is None  # pilots have no points


@pytest.mark.parametrize("definition", DEFINITIONS)
def test_strips_and_workers_change_nothing(ofdm, definition) -> None:
    signal = clipped(ofdm)
    asked = settings(definition, has_spread=True)
    one = measure_evm(signal, settings=asked)
    assert measure_evm(signal, settings=asked, strip_samples=5_001, workers=2) == one


def test_a_staggered_carrier_at_any_phase() -> None:
    """The fit is on the rails before they are joined: a turn of the phase costs nothing."""
    settings = SingleCarrier(
        constellation=Constellation.parse("16qam"), symbol_rate_hz=RATE_HZ / 4, stagger=True
    )
    carrier = settings.build(site(16_000))
    turned = equalised(carrier, 0.5 * np.exp(0.9j))
    (found,) = measure_evm(carrier, turned, settings=EvmSettings(has_spread=True))
    assert found.percent < 0.01
    assert found.overall.unfitted_percent > 50
    assert found.gain_db == pytest.approx(6.02, abs=0.01)
    assert found.phase_deg == pytest.approx(-np.degrees(0.9), abs=0.01)
    assert found.overall.spread.peak_percent < 0.03


def test_signals_without_symbols_have_no_evm() -> None:
    assert measure_evm(Carrier().build(site())) == []


@pytest.mark.parametrize("definition", ["3gpp", "802.11"])
def test_definitions_ask_for_what_they_need(definition) -> None:
    with pytest.raises(ArgumentsError):
        EvmSettings(definition=definition)
