"""Masks in files of their own."""

import pytest

from wavegen.core.errors import FileError
from wavegen.recipe.dump import dump
from wavegen.recipe.load import load_text
from wavegen.recipe.mask_file import LARGEST_BYTES, load_mask

MASK = """# Of the weir link.
points:
  - {offset: 10 MHz, level: -30 dB}
  - {offset: 20 MHz, level: -50 dB}
measurement_bandwidth: 100 kHz
"""


def write(tmp_path, text):
    path = tmp_path / "mask.yaml"
    path.write_text(text, encoding="utf-8")
    return path


def test_points_and_bandwidth(tmp_path):
    mask = load_mask(write(tmp_path, MASK + "reference: peak_density\nboth_sides: false\n"))
    assert [(point.offset_hz, point.level_db) for point in mask.points] == [
        (10e6, -30),
        (20e6, -50),
    ]
    assert mask.measurement_bandwidth_hz == 100e3
    assert mask.reference == "peak_density"
    assert not mask.both_sides


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (MASK.replace("level: -50 dB", "level: -50"), "points[1].level"),
        (MASK.replace("20 MHz", "5 MHz"), "points"),
        (MASK + "colour: red\n", "colour"),
        ("points: [", "YAML"),
        (MASK.replace("measurement_bandwidth: 100 kHz\n", ""), "measurement_bandwidth"),
        ("#" * (LARGEST_BYTES + 1), "larger"),
    ],
)
def test_what_is_refused(tmp_path, text, said):
    with pytest.raises(FileError) as refused:
        load_mask(write(tmp_path, text))
    assert said in str(refused.value)
    assert "mask.yaml" in refused.value.where


def test_no_file_and_no_text(tmp_path):
    with pytest.raises(FileError):
        load_mask(tmp_path / "nowhere.yaml")
    (tmp_path / "binary").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(FileError):
        load_mask(tmp_path / "binary")


def test_a_recipe_writes_the_same_points():
    text = (
        "wavegen: 1\nsample_rate: 4 MHz\nduration: 2 ms\nsignal: {kind: carrier}\n"
        "mask: {points: [{offset: 10 MHz, level: -30 dB}, {offset: 20 MHz, level: -50 dB}], "
        "measurement_bandwidth: 100 kHz}\n"
    )
    recipe = load_text(text).recipe
    assert recipe.mask.points[1].level_db == -50
    assert load_text(dump(recipe)).recipe == recipe
