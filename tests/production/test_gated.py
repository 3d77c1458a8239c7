"""A gated stimulus: on-time and whole, both by name, in files, sidecar and bench."""

import json

import numpy as np
import pytest

from wavegen.core.errors import TargetMissed

BURSTS = """\
wavegen: 1
sample_rate: 1 MHz
duration: 40 ms
signal: {kind: noise, bandwidth: 250 kHz}
stages:
  - {kind: gate, duty: 25 %, period: 1 ms, ramp: 10 us}
"""
BENCH = """\
bench:
  average_power_at_device: 0 dBm
  averaged_over: OVER
  path:
    - {name: part, role: device, peak_limit: LIMIT dBm}
"""


def test_both_statistics_against_numpy(lab, tmp_path):
    made = lab.make(BURSTS, tmp_path)
    document = json.loads(next(p for p in made.files if p.name.endswith(".json")).read_text())
    power = np.abs(lab.read_ci16(made.files[0]).astype(np.complex128)) ** 2
    place = np.arange(power.size) % 1000
    on = power[(place >= 10) & (place < 240)]
    whole, inside = document["mean_dbfs"], document["on_time"]["mean_dbfs"]
    assert whole == pytest.approx(10 * np.log10(power.mean()), abs=1e-5)
    assert inside == pytest.approx(10 * np.log10(on.mean()), abs=1e-5)
    assert document["on_time"]["n_samples"] == on.size
    assert document["on_time"]["duty"] == 0.25
    for row in document["on_time"]["levels"][:3]:
        level = 10 ** (row["level_db"] / 10) * on.mean()
        # One bin of the histogram, 0.0085 dB, moves an exponential tail by 0.2 % x level over mean.
        assert np.mean(on > level) == pytest.approx(row["probability"], rel=0.03)


def test_nothing_of_it_without_a_gate(lab, tmp_path):
    made = lab.make(BURSTS.partition("stages")[0], tmp_path)
    assert made.document["on_time"] is None
    assert made.document["files"][0]["on_time"] is None


def test_the_bench_averages_over_what_the_recipe_says(lab, tmp_path):
    peaks = {}
    for over in ("period", "burst"):
        text = BURSTS + BENCH.replace("OVER", over).replace("LIMIT", "60")
        bench = lab.make(text, tmp_path / over).document["bench"]
        assert bench["averaged_over"] == over
        peaks[over] = bench["path"][0]["peak_envelope_dbm"]
    # The same average over the burst alone is a quarter of the power: less the ramps, 6.1 dB.
    duty = (230 + 2 * 10 * 3 / 8) / 1000
    assert peaks["period"] - peaks["burst"] == pytest.approx(-10 * np.log10(duty), abs=0.1)


def test_a_rating_over_the_period_is_passed_where_the_burst_is_not(lab, tmp_path):
    limit = BENCH.replace("LIMIT", "13")
    lab.make(BURSTS + limit.replace("OVER", "burst"), tmp_path / "a")
    with pytest.raises(TargetMissed):
        lab.make(BURSTS + limit.replace("OVER", "period"), tmp_path / "b")
