import json
from fractions import Fraction

import numpy as np
import pytest

from wavegen.comparison.gain_curve import GainSettings, gain_curve
from wavegen.comparison.side import SideSettings
from wavegen.files.format import ReadHints
from wavegen.production.subject_files import FilePart

P1DB = 10 / 2 * np.log10(10**0.2 - 1)  # of a Rapp curve, p = 2, over saturation: -1.165 dB


@pytest.fixture
def written(tmp_path):
    def written(name, samples, *, level_dbm=None, loops=True):
        path = tmp_path / f"{name}.cf32_le"
        np.asarray(samples, "<c8").tofile(path)
        hints = ReadHints(sample_rate_hz=Fraction(10**6), reference_level_dbm=level_dbm)
        return SideSettings(subject=str(path), hints=hints, part=FilePart(loops=loops))

    return written


def test_loops_of_one_stimulus(written, noise, rapp):
    samples = noise(1 << 16) * 10 ** (-8 / 20)
    found = gain_curve(
        written("in", samples, level_dbm=-20.0), written("out", rapp(samples), level_dbm=20.0)
    )
    json.dumps(found, allow_nan=False)
    assert found["verdict"] == "differ"
    assert found["input_p1db_dbm"] == pytest.approx(P1DB - 20, abs=0.03)
    assert found["small_signal_gain_db"] == pytest.approx(40, abs=0.01)
    for row in found["gain"]:
        true = 40 - 5 * np.log10(1 + 10 ** ((row["input_dbm"] + 20) / 5))
        assert row["gain_db"] == pytest.approx(true, abs=0.01)
        assert row["low_db"] == row["high_db"] == row["gain_db"]
        assert row["input_dbm"] - row["input_db"] == pytest.approx(found["input"]["mean_dbm"])
    assert found["aligned"]["correlation"] > 0.95
    # -ln of the share is the level over the mean.
    over = -np.log(found["over_p1db"]["share"])
    assert 10 * np.log10(over) == pytest.approx(P1DB + 8, abs=0.15)


def test_the_rule_of_thumb_is_corrected_by_the_mean(written, noise, rapp):
    samples = noise(1 << 18) * 10 ** (-8 / 20)
    found = gain_curve(written("in", samples), written("out", rapp(samples)))
    rule = found["rule_of_thumb"]
    row = next(row for row in found["levels"] if row["probability"] == 1e-4)
    level_db = 10 * np.log10(np.mean(np.abs(samples) ** 2)) + row["input_over_mean_db"]
    assert rule["corrected_db"] == pytest.approx(-5 * np.log10(1 + 10 ** (level_db / 5)), abs=0.02)
    assert rule["change_db"] == pytest.approx(
        rule["corrected_db"] + rule["mean_compression_db"], abs=1e-3
    )
    means = [10 * np.log10(np.mean(np.abs(x) ** 2)) for x in (samples, rapp(samples))]
    assert rule["mean_compression_db"] == pytest.approx(means[0] - means[1], abs=0.01)


def test_a_linear_device_matches(written, noise):
    samples = noise(1 << 14)
    found = gain_curve(written("in", samples), written("out", samples / 3))
    assert found["verdict"] == "match"
    assert found["input_p1db_db"] is None
    assert found["compression"] == []
    assert found["rapp"] is None
    assert found["expansion"] is None


def test_expansion_is_shown_as_such(written, noise):
    samples = noise(1 << 16) * 10 ** (-10 / 20)
    found = gain_curve(
        written("in", samples), written("out", samples * (1 + 0.3 * np.abs(samples) ** 2))
    )
    assert found["expansion"]["gain_db"] > 0.5
    assert "expands" in found["statement"]


def test_different_captures_have_intervals(written, noise, rapp):
    # Down to 1 %, or 2^16 samples would leave the verdict open.
    captures = [noise(1 << 16) * 10 ** (-5 / 20) for _ in range(2)]
    found = gain_curve(
        written("in", captures[0], loops=False),
        written("out", rapp(captures[1]), loops=False),
        GainSettings(down_to=0.01),
    )
    assert found["verdict"] == "differ"
    assert found["aligned"] is None
    (point, *_) = found["compression"]
    assert point["low"] < point["input"] < point["high"]
    assert point["low"] < P1DB + 5 < point["high"]
    assert all(row["low_db"] < row["gain_db"] < row["high_db"] for row in found["gain"])


def test_mismatched_units_are_told(written, noise):
    samples = noise(1 << 14)
    found = gain_curve(written("in", samples, level_dbm=-10.0), written("out", samples))
    assert any("one side is in dBm" in row["text"] for row in found["warnings"])
    assert found["gain_is"].startswith("over the gain at low levels")
    assert "input_p1db_dbm" in found


def test_the_model_is_written(written, noise, rapp, tmp_path):
    samples = noise(1 << 16) * 0.4
    path = tmp_path / "device.csv"
    found = gain_curve(
        written("in", samples), written("out", 5 * rapp(samples)), GainSettings(model=path)
    )
    assert found["model"] == str(path)
    rows = [line for line in path.read_text().splitlines() if not line.startswith("#")]
    assert rows[0] == "input_dbm,output_dbm,phase_deg"
    values = np.array([[float(cell) for cell in line.split(",")] for line in rows[1:]])
    # Relative: 0 dBm is the mean input, and the gain at low levels is 0 dB.
    assert values[0, 1] - values[0, 0] == pytest.approx(0, abs=0.01)
    at_mean = np.interp(0.0, values[:, 0], values[:, 1])
    assert at_mean == pytest.approx(-5 * np.log10(1 + 0.16**2), abs=0.02)


def test_two_curves_by_points(tmp_path):
    """Points of a law, and of the law behind a Rapp curve over its new mean."""
    share = np.logspace(-0.02, -6, 300)
    power = -np.log(share) * 0.16
    output = power / (1 + power**2) ** 0.5
    means = [np.trapezoid(item[::-1], share[::-1]) for item in (power, output)]
    paths = []
    for name, item, mean in zip(("in", "out"), (power, output), means, strict=True):
        rows = [f"{10 * np.log10(p / mean):.5f},{q:.9g}" for p, q in zip(item, share, strict=True)]
        paths.append(tmp_path / f"{name}.csv")
        paths[-1].write_text("level_db,ccdf\n" + "\n".join(rows) + "\n")
    found = gain_curve(*(SideSettings(subject=str(path)) for path in paths))
    assert found["input_p1db_db"] == pytest.approx(P1DB + 10 * np.log10(1 / 0.16), abs=0.05)
    rule = found["rule_of_thumb"]
    # The mean of a Rapp curve's output by numbers, 0.058 dB down.
    assert rule["mean_compression_db"] == pytest.approx(
        10 * np.log10(means[0] / means[1]), abs=0.02
    )
