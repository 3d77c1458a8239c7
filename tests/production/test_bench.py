from dataclasses import replace

import pytest

from wavegen.core.errors import ArgumentsError, TargetMissed
from wavegen.production.bench import (
    check_risks,
    generator_level,
    path_levels,
    peak_volts,
    reflection,
    refuse_overload,
    watts,
)
from wavegen.recipe.bench import Bench, Generator, PathStage


def bench(**limits):
    places = [
        PathStage(name="generator", role="generator", gain_db=0.0),
        PathStage(name="cable", role="cable", gain_db=-1.5, peak_limit_dbm=33.0),
        PathStage(name="amplifier", role="device", gain_db=30.0, **limits),
        PathStage(name="pad", role="attenuator", gain_db=-20.0, average_limit_dbm=20.5),
        PathStage(name="sensor"),
    ]
    return Bench(average_power_at_device_dbm=-10.0, path=tuple(places))


def test_levels_before_and_after_the_device_by_hand():
    levels = path_levels(bench(), papr_db=9.25)
    # before: -10 + 1.5 at the cable, and the generator has no gain; after: +30, then -20
    assert [level.average_dbm for level in levels] == [-8.5, -8.5, -10.0, 20.0, 0.0]
    assert [level.peak_envelope_dbm for level in levels] == [0.75, 0.75, -0.75, 29.25, 9.25]
    assert [level.role for level in levels] == ["generator", "cable", "device", "attenuator", ""]
    refuse_overload(levels)


@pytest.mark.parametrize(
    ("limits", "what"),
    [
        ({"peak_limit_dbm": -0.76}, "peak envelope power"),
        ({"average_limit_dbm": -10.01}, "average power"),
    ],
)
def test_the_first_rating_that_is_exceeded(limits, what):
    with pytest.raises(TargetMissed) as caught:
        refuse_overload(path_levels(bench(**limits), papr_db=9.25))
    assert caught.value.where == "bench.path[2]"
    assert what in caught.value.problem
    assert "'amplifier'" in caught.value.problem


def test_a_rating_that_is_just_met_passes():
    refuse_overload(path_levels(bench(peak_limit_dbm=-0.75, average_limit_dbm=-10.0), papr_db=9.25))


BENCH = """bench:
  average_power_at_device: -10 dBm
  path:
    - {name: amplifier, role: device, gain: 30 dB, peak_limit: LIMIT dBm}
"""


def test_overload_is_refused_before_any_file_exists(lab, tmp_path):
    with pytest.raises(TargetMissed) as caught:
        lab.make(lab.SINGLE + BENCH.replace("LIMIT", "-8"), tmp_path)
    assert caught.value.where == "bench.path[0]"
    assert lab.left_in(tmp_path) == []


def test_overload_leaves_the_files_of_before(lab, tmp_path):
    lab.make(lab.SINGLE, tmp_path)
    before = {path: path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()}
    with pytest.raises(TargetMissed):
        lab.make(lab.SINGLE + BENCH.replace("LIMIT", "-8"), tmp_path, overwrite=True)
    after = {path: path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()}
    assert after == before


def test_the_sidecar_shows_peak_beside_average(lab, tmp_path):
    document = lab.make(lab.SINGLE + BENCH.replace("LIMIT", "0"), tmp_path).document
    (place,) = document["bench"]["path"]
    assert place["average_dbm"] == -10.0
    papr = document["scaling"]["peak_dbfs"] - document["scaling"]["average_dbfs"]
    assert place["peak_envelope_dbm"] == pytest.approx(-10 + papr, abs=1e-3)
    assert 3 < papr < 7  # QPSK at roll-off 0.22
    assert place["peak_limit_dbm"] == 0.0
    assert "qualified people" in document["safety"]


def test_powers_and_voltages_by_hand():
    assert watts(30) == pytest.approx(1)
    assert watts(36) == pytest.approx(3.98107, rel=1e-5)
    # sqrt(2 x 3.98107 W x 50 ohm) = sqrt(398.107) V
    assert peak_volts(36, 50) == pytest.approx(19.9526, rel=1e-5)
    assert peak_volts(10, 75) == pytest.approx(1.22474, rel=1e-5)
    assert reflection(PathStage(name="x", vswr=3)) == pytest.approx(0.5)
    assert reflection(PathStage(name="x")) == 0


def test_an_allowance_is_kept_free_below_a_rating():
    near = {"peak_limit_dbm": -0.5}  # the peak is -0.75 dBm
    refuse_overload(path_levels(bench(**near), papr_db=9.25))
    careful = replace(bench(**near), level_uncertainty_db=0.2, overshoot_db=0.1)
    with pytest.raises(TargetMissed) as caught:
        refuse_overload(path_levels(careful, papr_db=9.25))
    assert "0.3 dB more" in caught.value.problem
    (rating,) = path_levels(careful, papr_db=9.25)[2].ratings
    assert rating.margin_db == pytest.approx(-0.05)


def test_energy_at_a_sensor_and_level_at_a_mixer():
    path = (
        PathStage(name="amplifier", role="device", gain_db=20),
        PathStage(name="head", role="sensor", energy_limit_j=1e-6),
        PathStage(name="box", role="analyser", input_attenuation_db=10, mixer_limit_dbm=5),
    )
    levels = path_levels(
        Bench(average_power_at_device_dbm=-10, path=path),
        papr_db=6,
        burst_s=1e-4,
        burst_over_average_db=3.0103,
    )
    # 10 dBm average, 13.01 dBm in the burst: 20 mW for 0.1 ms are 2 uJ
    assert levels[1].burst_energy_j == pytest.approx(2e-6, rel=1e-4)
    assert levels[2].mixer_peak_dbm == pytest.approx(6)
    with pytest.raises(TargetMissed, match="energy"):
        refuse_overload(levels)
    assert refuse_overload(levels, accepted={"head.energy_limit", "box.mixer_limit"}) == [
        "head.energy_limit",
        "box.mixer_limit",
    ]


def test_the_generator_has_ratings_at_its_output():
    rated = replace(bench(), generator=Generator(peak_limit_dbm=0.5))
    levels = path_levels(rated, papr_db=9.25)
    own = generator_level(rated, levels)
    assert own.peak_envelope_dbm == pytest.approx(0.75)
    with pytest.raises(TargetMissed) as caught:
        refuse_overload([own, *levels])
    assert caught.value.where == "bench.generator"


def test_only_ratings_that_exist_can_be_accepted():
    check_risks(["cable.peak_limit"], bench())
    with pytest.raises(ArgumentsError) as caught:
        check_risks(["cable.average_limit"], bench())
    assert "cable.peak_limit" in caught.value.allowed
    with pytest.raises(ArgumentsError):
        check_risks(["x"], None)
