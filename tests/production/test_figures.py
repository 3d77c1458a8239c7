"""All figures of one signal in one rendering are those of the meters by themselves."""

import pytest

from wavegen.core.render import samples_of
from wavegen.meters.aclr import aclr
from wavegen.meters.fidelity import FidelitySettings
from wavegen.meters.power import measure_samples
from wavegen.meters.spectrum import spectrum_of
from wavegen.production.figures import has_symbols, measure_figures
from wavegen.production.neighbours import ChannelRequest, OccupiedBand, plan_channels
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

HEAD = "wavegen: 1\nsample_rate: 8 MHz\nduration: 8 ms\n"
QPSK = "signal: {kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz}\n"
CLIP = "stages: [{kind: clip, ceiling: 3 dB}]\n"
GATED = "stages: [{kind: clip, ceiling: 3 dB}, {kind: gate, pattern: '1100', slot: 1 ms}]\n"
NOISE = "signal: {kind: noise, bandwidth: 1 MHz}\n"


def built(*parts):
    return prepare(load_text(HEAD + "".join(parts))).built.signal


@pytest.fixture(scope="module")
def pair():
    return built(QPSK), built(QPSK, CLIP)


def test_level_and_neighbours_are_those_of_the_samples(pair):
    plan = plan_channels(ChannelRequest(), OccupiedBand(low_hz=-0.6e6, high_hz=0.6e6))
    got = measure_figures(pair[1], settings=FidelitySettings(channels=plan), workers=2)
    samples = samples_of(pair[1])
    power = measure_samples(samples)
    assert got.level_db(1e-3) == pytest.approx(float(power.level_db(1e-3)), abs=1e-9)
    assert got.peak_db == pytest.approx(3.0, abs=1e-5)
    own = aclr(
        spectrum_of(samples, sample_rate_hz=8e6), carrier=plan.carrier, neighbours=plan.neighbours
    )
    assert got.fidelity.aclr.worst_db == pytest.approx(own.worst_db, abs=1e-6)
    low, high = got.interval_db(1e-2)
    assert low <= got.level_db(1e-2) <= high
    assert high - low < 0.1


def test_without_symbols_the_error_of_the_waveform():
    clean, clipped = built(NOISE), built(NOISE, CLIP)
    is_found, why = has_symbols(clean)
    assert not is_found
    assert why
    got = measure_figures(clipped, settings=FidelitySettings(), reference=clean)
    assert got.fidelity.evm == ()
    assert got.fidelity.total.fitted_percent > 5


def test_a_gated_signal_is_measured_while_it_is_on(pair):
    gated = built(QPSK, GATED)
    is_found, why = has_symbols(gated)
    assert not is_found
    assert "gate" in why
    got = measure_figures(gated, settings=FidelitySettings())
    assert got.power.statistics.mean == pytest.approx(1.0, rel=0.02)
    assert got.peak_db == pytest.approx(3.0, abs=0.1)
    assert has_symbols(pair[1]) == (True, "")
