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
    longest_burst_s=2.5e-4,
    first_sample_db=-20.0,
    last_sample_db=3.0,
    bandwidth_hz=10e6,
    unreduced_papr_db=14.0,
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
    confused, unreduced, highest, held = found["mistakes"]
    # the period's mean at the device is -26 dBm, that of the burst -20, its peak -15; full scale
    # lies 12 dB over the mean of the period
    assert confused["average_dbm"] == pytest.approx(-8)
    assert confused["peak_envelope_dbm"] == pytest.approx(-3)
    assert unreduced["average_dbm"] == pytest.approx(-20)
    assert unreduced["peak_envelope_dbm"] == pytest.approx(-12)
    assert unreduced["over_peak_db"] == pytest.approx(3)
    assert highest["average_dbm"] == highest["peak_envelope_dbm"] == pytest.approx(-15)
    assert held["average_dbm"] == held["peak_envelope_dbm"] == pytest.approx(-23)
    assert found["edges"] == {"first_dbm": pytest.approx(-46), "last_dbm": pytest.approx(-23)}
    assert not found["sensors"][0]["follows"]
    rows = {row["probability"]: row for row in found["averaging"]}
    assert rows[0.01]["at_least_s"] == pytest.approx(1e-4)
    assert rows[0.01]["is_held_by_loop"]
    assert not rows[1e-4]["is_held_by_loop"]


RATED = (
    PathStage(name="generator", role="generator", peak_limit_dbm=0.0),
    PathStage(name="amplifier", role="device", gain_db=30.0, average_limit_dbm=-17.0),
    PathStage(name="pad", role="attenuator", gain_db=-20.0, peak_limit_dbm=17.0),
    PathStage(name="head", role="sensor", energy_limit_j=5e-8),
    PathStage(name="box", role="analyser", input_attenuation_db=10, mixer_limit_dbm=-14.0),
)


def test_which_ratings_a_mistake_exceeds():
    """At the device -20 dBm in the burst, peak -15: the head has -10 + 20 dB = -10 ... +10 dBm."""
    found = sheet(path=RATED)
    confused, unreduced, highest, held = found["mistakes"]
    # 12 dB more: amplifier -8 > -17, pad's peak 15 + 12 = 27 > 17, mixer -15 + 10 - 10 + 12 = -3;
    # the head has -10 dBm in 0.25 ms: 25 nJ, and 396 nJ with 12 dB more
    assert confused["exceeds"] == [
        "amplifier.average_limit",
        "pad.peak_limit",
        "head.energy_limit",
        "box.mixer_limit",
    ]
    # a peak of -12: pad 18 > 17, mixer -12 > -14
    assert unreduced["exceeds"] == ["pad.peak_limit", "box.mixer_limit"]
    # an average of -15 > -17; no peak is higher than planned, and a carrier is no pulse: its 5 dB
    # more would make 79 nJ of the 25, over the rated 50
    assert highest["exceeds"] == ["amplifier.average_limit"]
    assert held["exceeds"] == []


def test_a_generator_in_the_path_has_an_output_alone():
    found = sheet(path=RATED, generator=Generator(average_limit_dbm=10.0))
    first, second = found["path"][:2]
    assert (first["name"], first["at"]) == ("generator", "output")
    assert second["name"] == "amplifier"
    assert [item["name"] for item in first["ratings"]] == [
        "generator.average_limit",
        "generator.peak_limit",
    ]


def test_allowances_are_told_beside_the_margins():
    found = sheet(path=RATED, level_uncertainty_db=0.5, overshoot_db=0.3)
    assert found["allowances"] == {"level_uncertainty_db": 0.5, "overshoot_db": 0.3}
    pad = found["path"][2]
    (rating,) = pad["ratings"]
    assert rating["allowance_db"] == pytest.approx(0.8)
    assert rating["margin_db"] == pytest.approx(17 - 15 - 0.8)


def test_a_mismatch_is_told_only_where_it_is_stated():
    generator, cable, amplifier, *_ = sheet()["path"]
    assert generator["worst_peak_v"] is None
    assert cable["reflected_peak_dbm"] is None
    # VSWR 3 sends a quarter of the peak of -15 dBm back
    assert amplifier["reflected_peak_dbm"] == pytest.approx(-21.0206, abs=1e-4)


def test_a_second_channel_lies_where_the_file_puts_it():
    second = DOCUMENT | {"mean_dbfs": -15.0, "on_time": {"mean_dbfs": -10.0}, "channel": 1}
    bench = Bench(average_power_at_device_dbm=-20.0, averaged_over="burst", path=PATH)
    found = bench_sheet(bench, second, FACTS, first=DOCUMENT)
    # the bursts of the first have -20 dBm, those of the second lie 4 dB lower
    device = found["path"][2]
    assert found["channel"] == 1
    assert device["average_dbm"] == pytest.approx(-24)
    assert device["peak_envelope_dbm"] == pytest.approx(-15)  # 9 dB over its burst
    # full scale is the same power at both outputs
    assert found["set"]["if_it_means_full_scale_dbm"] == pytest.approx(
        sheet()["set"]["if_it_means_full_scale_dbm"]
    )


def test_accepted_risks_are_marked():
    document = DOCUMENT | {"bench": {"accepted_risks": ["cable.peak_limit"]}}
    path = (PathStage(name="cable", role="cable", gain_db=-1.0, peak_limit_dbm=-15.0), *PATH[1:])
    bench = Bench(average_power_at_device_dbm=-20.0, averaged_over="burst", path=path)
    (rating,) = bench_sheet(bench, document, FACTS)["path"][1]["ratings"]
    assert rating["is_accepted"]
    assert rating["margin_db"] == pytest.approx(-1)


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
    assert facts.first_sample_db < 5.1
    assert facts.last_sample_db < 5.1
