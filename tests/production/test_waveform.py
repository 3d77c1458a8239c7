import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.stored import Scratch
from wavegen.production.waveform import render_loop


@pytest.fixture
def rendered(lab, tmp_path):
    def run(text, workers=1):
        prepared = lab.prepared(text)
        signal = prepared.built.signal
        with Scratch(
            folder=tmp_path, sample_rate_hz=signal.sample_rate_hz, n_samples=signal.n_samples
        ) as scratch:
            waveform = render_loop(
                prepared.built, scratch, cycle_samples=prepared.cycle_samples, workers=workers
            )
            stored = samples_of(waveform.signal)
        return prepared, waveform, stored

    return run


def test_scratch_holds_the_signal_and_the_figures_are_its_own(lab, rendered):
    prepared, waveform, stored = rendered(lab.SINGLE)
    assert np.array_equal(stored, samples_of(prepared.built.signal))
    power = np.abs(stored.astype(np.complex128)) ** 2
    assert waveform.statistics.mean == pytest.approx(power.mean(), rel=1e-6)
    assert waveform.statistics.peak == pytest.approx(power.max(), rel=1e-6)
    assert waveform.peak.power >= waveform.statistics.peak
    assert waveform.papr_db == pytest.approx(
        10 * np.log10(waveform.peak.power / power.mean()), abs=1e-5
    )
    assert waveform.seam.is_clean


def test_part_means_are_those_of_each_part_before_it_is_weighed(lab, rendered):
    text = lab.HEAD + (
        f"signal: {{kind: sum, parts: [{{signal: {{{lab.QPSK}}}, level: -10 dB, "
        "stages: [{kind: scale, gain: 5 dB}]}, {signal: {kind: carrier}}]}\n"
    )
    prepared, waveform, _ = rendered(text)
    assert set(waveform.part_means) == {"signal.parts[0]", "signal.parts[1]"}
    for part in prepared.built.parts:
        power = np.abs(samples_of(part.signal).astype(np.complex128)) ** 2
        assert waveform.part_means[part.path] == pytest.approx(power.mean(), rel=1e-6)
    assert waveform.part_means["signal.parts[0]"] == pytest.approx(10**0.5, rel=0.1)
    assert waveform.part_means["signal.parts[1]"] == pytest.approx(1.0, rel=1e-6)
