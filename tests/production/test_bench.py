import pytest

from wavegen.core.errors import TargetMissed
from wavegen.production.bench import path_levels, refuse_overload
from wavegen.recipe.settings import Bench, PathStage


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
