"""The bench sheet's arithmetic, by hand."""

import pytest

from wavegen.production.bench_sheet import SheetFacts, bench_sheet, sheet_facts
from wavegen.production.prepare import prepare
from wavegen.recipe.bench import Bench, Generator, PathStage
from wavegen.recipe.load import load_text

PATH = (
    PathStage(name="cable", role="cable", gain_db=-1.0, peak_limit_dbm=30.0),
    PathStage(name="amplifier", role="device", gain_db=46.0, vswr=3.0),
    PathStage(name="pad", role="attenuator", gain_db=-40.0),
    PathStage(name="head", role="sensor", video_bandwidth_hz=5e6),
)
DOCUMENT = {
    "title": "T",
    "recipe": {"name": "t"},
    "mean_dbfs": -12.0,
    "peak_between_samples_dbfs": -1.0,
    "on_time": {"mean_dbfs": -6.0},
    "sample_rate_hz": 100e6,
    "n_samples": 100_000,
    "duration_s": 1e-3,
    "files": [{"name": "t.sigmf-data", "sha512": "ab", "bits": None, "datatype": "ci16_le"}],
}
FACTS = SheetFacts(
    longest_burst_s=2.5e-4, last_sample_db=3.0, bandwidth_hz=10e6, unreduced_papr_db=14.0
)


def sheet(**more):
    wanted = {"average_power_at_device_dbm": -20.0, "averaged_over": "burst", "path": PATH}
    return bench_sheet(Bench(**(wanted | more)), DOCUMENT, FACTS)


def test_both_conventions_of_the_level():
    found = sheet()["set"]
    # burst -20 dBm at the device, -19 dBm before the cable; the period lies 6 dB lower
    assert found["average_over_burst_dbm"] == pytest.approx(-19)
    assert found["if_it_means_rms_dbm"] == pytest.approx(-25)
    assert found["if_it_means_full_scale_dbm"] == pytest.approx(-13)
    assert found["back_off_db"] == pytest.approx(12)
    assert found["peak_envelope_dbm"] == pytest.approx(-14)


def test_powers_voltages_and_reflection_along_the_path():
    generator, cable, amplifier, pad, head = sheet()["path"]
    assert generator["at"] == "output"
    assert cable["average_dbm"] == pytest.approx(-19)
    assert amplifier["average_dbm"] == pytest.approx(-20)
    assert amplifier["peak_envelope_dbm"] == pytest.approx(-15)
    assert pad["average_dbm"] == pytest.approx(26)
    assert pad["peak_envelope_dbm"] == pytest.approx(31)
    # 31 dBm are 1.2589 W: sqrt(2 x 1.2589 x 50) = 11.220 V
    assert pad["peak_envelope_w"] == pytest.approx(1.2589, rel=1e-4)
    assert pad["peak_v"] == pytest.approx(11.220, rel=1e-4)
    assert pad["open_peak_v"] == pytest.approx(22.440, rel=1e-4)
    # VSWR 3 reflects half the voltage, a quarter of the power: 6.02 dB down
    assert amplifier["reflected_dbm"] == pytest.approx(-26.0206, abs=1e-4)
    assert amplifier["worst_peak_v"] == pytest.approx(1.5 * amplifier["peak_v"])
    assert head["average_dbm"] == pytest.approx(-14)
    (rating,) = cable["ratings"]
    assert rating["margin_db"] == pytest.approx(30 - -14)


def test_averaged_over_the_period():
    found = sheet(averaged_over="period")
    assert found["set"]["if_it_means_rms_dbm"] == pytest.approx(-19)
    assert found["set"]["average_over_burst_dbm"] == pytest.approx(-13)
    assert found["set"]["peak_envelope_dbm"] == pytest.approx(-8)


def test_what_the_generator_takes():
    limits = Generator(
        clock_most_hz=80e6, memory_samples=50_000, granularity_samples=48, word_bits=16
    )
    rows = {row["what"]: row for row in sheet(generator=limits)["generator"]}
    assert not rows["clock"]["is_met"]
    assert not rows["length"]["is_met"]
    assert not rows["granularity"]["is_met"]
    assert "99984 or 100032" in rows["granularity"]["allowed"]
    assert rows["word"]["is_met"]
    easy = Generator(clock_least_hz=1e6, clock_most_hz=2e8, granularity_samples=16)
    assert all(row["is_met"] for row in sheet(generator=easy)["generator"])


def test_mistakes_sensor_and_time():
    found = sheet()
    unreduced, held = found["mistakes"]
    # the period's mean at the device is -26 dBm
    assert unreduced["peak_envelope_dbm"] == pytest.approx(-12)
    assert unreduced["over_db"] == pytest.approx(3)
    assert held["peak_envelope_dbm"] == pytest.approx(-23)
    assert not found["sensors"][0]["follows"]
    rows = {row["probability"]: row for row in found["averaging"]}
    assert rows[0.01]["at_least_s"] == pytest.approx(1e-4)
    assert rows[0.01]["is_held_by_loop"]
    assert not rows[1e-4]["is_held_by_loop"]


def test_facts_are_measured():
    text = """\
wavegen: 1
sample_rate: 8 MHz
duration: 4 ms
signal: {kind: noise, bandwidth: 2 MHz}
"""
    clipped = prepare(load_text(text + "stages: [{kind: clip, ceiling: 5 dB}]\n", name="x"))
    plain = prepare(load_text(text, name="x")).built.signal
    facts = sheet_facts(clipped.built.signal, mean_power=1.0, unreduced=plain)
    assert facts.longest_burst_s is None
    assert facts.bandwidth_hz == pytest.approx(2e6, rel=0.2)
    assert 8 < facts.unreduced_papr_db < 13
    assert facts.last_sample_db < 5.1
