"""Halves of real recordings against each other: verdicts that the recordings deserve.

What is known of them: tests/files/recordings/README.md. Figures here by NumPy on the codes.
"""

from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.comparison.match import MatchSettings, match
from wavegen.comparison.side import SideSettings
from wavegen.core.timespan import TimeSpan
from wavegen.files.format import ReadHints
from wavegen.production.measure_settings import GateSettings
from wavegen.production.subject_files import FilePart

FOLDER = Path(__file__).resolve().parents[1] / "files" / "recordings"
WIFI = FOLDER / "wifi_11a_conducted_20msps.ci16_le"
NOISE = FOLDER / "rxnoise_440mhz_10ksps.ci16_le"
UPLINK = FOLDER / "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"


def powers(path):
    rails = np.fromfile(path, "<i2").astype(np.float64).reshape(-1, 2) / 32768
    return (rails**2).sum(axis=1)


def level_db(power, share):
    """Return the power that a share of the samples exceeds, over their mean."""
    return 10 * np.log10(np.sort(power)[::-1][int(share * power.size)] / power.mean())


def halves(path, n, rate_hz=None, *, first=0, **settings):
    def side(start, stop):
        part = FilePart(
            first=TimeSpan.parse(f"{start} samples"), stop=TimeSpan.parse(f"{stop} samples")
        )
        hints = ReadHints(sample_rate_hz=None if rate_hz is None else Fraction(rate_hz))
        return SideSettings(subject=str(path), hints=hints, part=part, **settings)

    return side(first, n // 2), side(n // 2, n)


def row(found, probability):
    return next(item for item in found["levels"] if item["probability"] == probability)


def test_packets_of_one_card_are_too_short_to_tell():
    n = 52_000
    found = match(*halves(WIFI, n, 20_000_000))
    assert found["verdict"] == "undecided"
    power = powers(WIFI)
    for share in (0.1, 0.01, 1e-3):
        expected = level_db(power[: n // 2], share) - level_db(power[n // 2 :], share)
        # Between the two samples next to it, and the bins of the meter.
        assert row(found, share)["difference_db"] == pytest.approx(expected, abs=0.05)
    assert found["needed"]["times"] > 10
    assert found["looks_like"][0]["law"] == "complex Gaussian"  # OFDM
    assert found["looks_like"][0]["is_near"]
    assert found["spectrum"]["field_occupied_hz"] == pytest.approx(15.5e6, rel=0.02)
    assert abs(found["spectrum"]["largest_difference_db"]) < 0.5


def test_a_fill_word_makes_halves_differ():
    """One sample of full scale lifts the mean of the first half by 25.5 dB."""
    found = match(*halves(NOISE, 10_000, 10_000), MatchSettings(looks=False))
    power = powers(NOISE)[:5000]
    lifted_db = 10 * np.log10(power.mean() / power[1:].mean())
    assert lifted_db == pytest.approx(25.5, abs=0.1)
    assert found["verdict"] == "differ"
    assert f"{lifted_db:.1f}"[:4] in found["statement"]
    assert found["largest_difference_db"] < -20


def test_without_it_and_without_the_offset_halves_are_alike_as_far_as_can_be_told():
    found = match(*halves(NOISE, 10_000, 10_000, first=100, removes_offset=True))
    assert found["verdict"] == "undecided"
    assert abs(found["largest_difference_db"]) < 0.5
    assert found["looks_like"][0]["law"] == "complex Gaussian"
    assert found["looks_like"][0]["is_near"]


def test_bursts_of_a_beacon_are_no_noise():
    found = match(*halves(UPLINK, 78_000, gate=GateSettings(by="level")))
    assert found["verdict"] != "match"
    assert not any(
        look["is_near"] for look in found["looks_like"] if look["law"] == "complex Gaussian"
    )
    assert found["stimulus"]["duty"] is not None
