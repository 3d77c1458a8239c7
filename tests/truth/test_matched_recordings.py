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
    # One burst and a half on one side, a half on the other.
    assert any("from burst to burst" in row["text"] for row in found["warnings"])


BURSTS = (
    (47.33, 44.89, -32.58),
    (167.33, 48.09, -35.33),
    (359.33, 16.09, -32.48),
    (393.33, 80.09, -37.61),
    (489.32, 8.09, -37.40),
    (514.32, 4.09, -35.46),
    (572.32, 4.09, -38.56),
    (605.32, 12.10, -33.63),  # of several tones: its peak is 4.6 dB above its mean
    (714.32, 4.09, -37.36),
    (736.32, 1.10, -33.81),
)
"""Start and length, ms, and mean power, dBFS, of each burst of the whole uplink recording, by a
level gate on its 512 000 samples (the file here is a cut of it); the floor is at -80 dBFS."""
SEVERAL_TONES_DBFS = -33.63


@pytest.fixture
def beacon(tmp_path):
    """The whole recording's bursts at their places and levels, of a simple modulation."""
    rng = np.random.default_rng(832)
    n, rate = 512_000, 640_000
    samples = 1e-4 * (rng.standard_normal(n) + 1j * rng.standard_normal(n)) / np.sqrt(2)
    for start, length, level in BURSTS:
        part = slice(round(start * rate / 1e3), round((start + length) * rate / 1e3))
        count = part.stop - part.start
        ripple = np.convolve(rng.standard_normal(count + 63), np.hanning(64), "valid") / 5
        ripple *= 3.5 if level == SEVERAL_TONES_DBFS else 1.0
        phase = np.cumsum(rng.choice([-1, 1], count // 32 + 1).repeat(32)[:count]) * np.pi / 64
        burst = (1 + 0.2 * ripple) * np.exp(1j * phase)
        samples[part] += burst * np.sqrt(10 ** (level / 10) / np.mean(np.abs(burst) ** 2))
    path = tmp_path / "beacon.cf32_le"
    samples.astype("<c8").tofile(path)
    return path


def test_halves_of_ten_bursts_differ_as_recorded_and_their_process_stays_open(beacon):
    """Few bursts of unlike levels: the records differ, their process is not known well enough.

    The halves of the whole recording stand 5.2 dB apart at 0.01 %. That may be chance: of the 590
    ways to share out its ten bursts, each with the silence about it, to two parts of 35 to 65 % of
    the time, one in ten leaves parts as far apart at 0.01 % or further, and one in nine does so at
    one of the levels from 2 to 0.01 % (counted with NumPy). What may happen to one process in one
    of ten cases is no proof of two, where one in twenty is what a wrong *differ* may cost. So the
    verdict stays open, the difference of the records stands first in it, and whoever wants these
    records themselves compared gets *differ*.
    """
    sides = halves(beacon, 512_000, 640_000)
    found = match(*sides, MatchSettings(looks=False))
    assert found["verdict"] == "undecided"
    recorded = found["as_recorded"]
    power = np.abs(np.fromfile(beacon, "<c8")) ** 2
    apart_db = level_db(power[:256_000], 1e-4) - level_db(power[256_000:], 1e-4)
    assert -5.5 < apart_db < -4.5
    assert row(found, 1e-4)["difference_db"] == pytest.approx(apart_db, abs=0.05)
    assert recorded["verdict"] == "differ"
    assert recorded["difference_db"] <= row(found, 1e-4)["difference_db"]
    said = f"undecided: as recorded the stimulus stands {abs(recorded['difference_db']):.2f} dB"
    assert found["statement"].startswith(said)
    assert found["needed"]["shows"] == "differ"
    assert 10 < found["needed"]["times"] < 1000
    assert any("--gate auto" in row["text"] for row in found["warnings"])
    records = match(*sides, MatchSettings(looks=False, is_of_records=True))
    assert records["verdict"] == "differ"
    assert records["decisive"]["difference_db"] == recorded["difference_db"]
