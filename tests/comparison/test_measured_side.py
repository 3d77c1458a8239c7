import numpy as np
import pytest

from wavegen.comparison.curves import SampledCurve
from wavegen.comparison.side import RECORDING, SideSettings
from wavegen.comparison.sides import open_side
from wavegen.core.errors import SignalError
from wavegen.files.format import ReadHints
from wavegen.laws.gaussian import GaussianLaw
from wavegen.production.measure_settings import GateSettings

AUTO = GateSettings(by="level")


@pytest.fixture
def recorded(tmp_path, noise):
    def recorded(samples=None, name="field.cf32_le", rate_hz=1_000_000):
        path = tmp_path / name
        np.asarray(noise(1 << 15) if samples is None else samples, "<c8").tofile(path)
        return {"subject": str(path), "hints": ReadHints(sample_rate_hz=rate_hz)}

    return recorded


def test_a_recording_is_a_sample_of_its_process(recorded):
    side = open_side(SideSettings(**recorded()))
    assert side.is_ == RECORDING
    assert isinstance(side.curve, SampledCurve)
    assert side.mean_low_db < side.mean_db < side.mean_high_db
    assert side.scale == "dBFS"
    assert side.scale_curve.level_db(0.1) == pytest.approx(
        float(side.curve.level_db(0.1)) + side.mean_db
    )


def test_bursts_each_over_its_own_mean(recorded, noise):
    """Half of the bursts 20 dB down: over the common mean they widen the curve."""
    samples = noise(1 << 15)
    place = np.arange(1 << 15) % 8192
    samples[place % 2048 < 1024] = 0
    samples[place >= 4096] *= 0.1
    settings = recorded(samples)
    threshold = {"by": "level", "threshold_db": -35.0}
    pooled = open_side(SideSettings(**settings, gate=GateSettings(**threshold)))
    each = open_side(SideSettings(**settings, gate=GateSettings(**threshold, each=True)))
    wanted_db = float(GaussianLaw().level_db(0.1))
    assert each.curve.level_db(0.1) == pytest.approx(wanted_db, abs=0.3)
    assert pooled.curve.level_db(0.1) > wanted_db + 1
    assert each.mean_db == pytest.approx(pooled.mean_db)
    assert each.scale_curve is None


def test_no_bursts_to_compare(recorded):
    with pytest.raises(SignalError) as caught:
        open_side(SideSettings(**recorded(np.ones(1 << 14)), gate=AUTO))
    assert "bursts" in caught.value.problem


def test_an_offset_is_taken_off(recorded, noise):
    samples = noise(1 << 15) + 5
    plain = open_side(SideSettings(**recorded(samples)))
    clean = open_side(SideSettings(**recorded(samples), removes_offset=True))
    assert plain.curve.level_db(0.01) < 3
    assert clean.curve.level_db(0.01) == pytest.approx(6.6, abs=0.3)
    assert any("DC offset" in text for text in plain.warnings)
    assert not any("DC offset" in text for text in clean.warnings)


def test_real_samples_are_read_as_their_envelope(tmp_path):
    n = np.arange(1 << 15)
    path = tmp_path / "tone.rf32_le"
    np.cos(2 * np.pi * 0.2 * n).astype("<f4").tofile(path)
    hints = ReadHints(format="rf32_le", sample_rate_hz=1_000_000)
    side = open_side(SideSettings(subject=str(path), hints=hints))
    assert side.curve.level_db([0.5, 0.01]) == pytest.approx([0, 0], abs=0.02)


def test_fill_words_are_told_of(recorded, noise):
    samples = noise(5000) / 1000
    samples[0] = 1 + 1j
    side = open_side(SideSettings(**recorded(samples)))
    # A sample of 2 among 5000 of 1e-6: 10 log10((2 + 5e-3) / 5e-3) = 26.0 dB.
    assert side.fault_db == pytest.approx(26.0, abs=0.2)
    assert open_side(SideSettings(**recorded(samples[1:]))).fault_db == 0


def test_a_reference_level_makes_levels_absolute(recorded):
    settings = recorded()
    hints = ReadHints(sample_rate_hz=1_000_000, reference_level_dbm=-20.0)
    plain, told = (
        open_side(SideSettings(**settings | {"hints": item})) for item in (settings["hints"], hints)
    )
    assert told.scale == "dBm"
    for key in ("mean_db", "mean_low_db", "peak_db"):
        assert getattr(told, key) == pytest.approx(getattr(plain, key) - 20)
    assert float(told.scale_curve.level_db(0.1)) == pytest.approx(
        float(plain.scale_curve.level_db(0.1)) - 20
    )


def test_a_silent_recording(recorded):
    with pytest.raises(SignalError):
        open_side(SideSettings(**recorded(np.zeros(1 << 12))))
