"""Stimuli in the shape of real recordings: faults left out, of bursts the on-time.

What is known of the recordings: tests/files/recordings/README.md. Levels are compared with those
that NumPy reads off the codes, so that nothing of the program stands on both sides.
"""

from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.comparison.shape import ShapeSettings, shape
from wavegen.comparison.side import SideSettings
from wavegen.files.format import ReadHints
from wavegen.production.measure_settings import GateSettings

FOLDER = Path(__file__).resolve().parents[1] / "files" / "recordings"
WIFI = FOLDER / "wifi_11a_conducted_20msps.ci16_le"
NOISE = FOLDER / "rxnoise_440mhz_10ksps.ci16_le"
UPLINK = FOLDER / "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"
LEVEL_DB, SPECTRUM_DB = 0.05, 0.5


def codes(path):
    return np.fromfile(path, "<i2").astype(np.float64).reshape(-1, 2) @ np.array([1, 1j])


def level_db(samples, share):
    power = np.abs(samples) ** 2
    return 10 * np.log10(np.quantile(power, 1 - share) / power.mean())


@pytest.fixture
def shaped(tmp_path):
    """What is said of a shaped recording, and the codes that were made."""

    def shaped(path, rate_hz=None, **settings):
        hints = ReadHints(sample_rate_hz=None if rate_hz is None else Fraction(rate_hz))
        side = SideSettings(subject=str(path), hints=hints, removes_offset=True, **settings)
        found = shape(side, ShapeSettings(name="twin", title="A twin"), out=tmp_path)
        return found, codes(tmp_path / "twin" / "twin.sigmf-data")

    return shaped


def check(found):
    assert found["verdict"] == "match"
    assert found["largest_difference_db"] < LEVEL_DB
    assert abs(found["spectrum"]["largest_difference_db"]) < SPECTRUM_DB


def test_packets(shaped):
    found, made = shaped(WIFI, 20_000_000)
    check(found)
    assert found["down_to"] <= 2e-4  # ten of 52 000 samples
    for share in (0.5, 0.1, 0.01, 1e-3):
        assert level_db(made, share) == pytest.approx(level_db(codes(WIFI), share), abs=LEVEL_DB)


def test_noise_without_its_fill_word_start_up_and_offset(shaped):
    """Of the raw record 90 % of the power is one sample, and 98 % of the rest an offset."""
    found, made = shaped(NOISE, 10_000)
    check(found)
    assert 18 <= found["skipped_samples"] < 100
    rest = codes(NOISE)[found["skipped_samples"] :]
    rest = rest - rest.mean()
    assert abs(made.mean()) ** 2 < 1e-3 * np.mean(np.abs(made) ** 2)
    for share in (0.1, 0.01):
        # The record's codes are 3.4 steps RMS: a level stands between two of them.
        assert level_db(made, share) == pytest.approx(level_db(rest, share), abs=0.1)
    assert level_db(codes(NOISE), 0.1) < -20  # as recorded


def test_bursts_of_a_beacon(shaped):
    """Two levels of narrow lines, 8 dB apart, hard to have in one spectrum: near, and said so.

    Rounds come nearer ever more slowly: 0.22 dB after 200, 0.12 dB after 800.
    """
    found, made = shaped(UPLINK, gate=GateSettings(by="level"))
    assert found["verdict"] == "differ"
    assert LEVEL_DB < found["largest_difference_db"] < 0.25
    assert abs(found["spectrum"]["largest_difference_db"]) < SPECTRUM_DB
    assert any("was not found" in row["text"] for row in found["warnings"])
    gate = found["gate"]
    period, on = gate["period_samples"], round(gate["duty"] * gate["period_samples"])
    for start in range(0, made.size, period):
        assert made[start : start + on].any()
        assert not made[start + on : start + period].any()
