"""Figures of a recipe before and after its stages."""

import json

import pytest

from wavegen.core.errors import RecipeError, SignalError
from wavegen.meters.evm_probe import EvmSettings
from wavegen.meters.mask import MaskPoint, SpectralMask
from wavegen.production.fidelity import (
    FidelityRequest,
    fidelity_document,
    recipe_fidelity,
)
from wavegen.recipe.load import load_text

HEAD = "wavegen: 1\nsample_rate: 7.68 MHz\nduration: 28 symbols\n"
CELL = (
    HEAD
    + """signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-36..-1", constellation: qpsk}
    - {subcarriers: "1..36", constellation: 64qam}
  cyclic_prefix: 36/512
  edge_window: 8/512
"""
)
CLIPPED = CELL + "stages: [{kind: clip_filter, ceiling: 6 dB, rounds: 4}]\n"
MASK = SpectralMask(
    points=(MaskPoint(offset_hz=1e6, level_db=-30), MaskPoint(offset_hz=3e6, level_db=-40)),
    measurement_bandwidth_hz=1e5,
)


@pytest.fixture(scope="module")
def clipped():
    loaded = load_text(CLIPPED, name="cell")
    request = FidelityRequest(evm=EvmSettings(limits="NR BS FR1", has_spread=True), mask=MASK)
    return fidelity_document(loaded, recipe_fidelity(loaded, request))


def test_before_and_after_stand_side_by_side(clipped):
    before, after = clipped["before"], clipped["after"]
    assert before["evm_percent"] < 0.01
    assert 2 < after["evm_percent"] < 10
    assert after["papr_db"] < before["papr_db"] - 1
    assert after["total_error_percent"] == pytest.approx(after["evm_percent"], rel=0.1)
    assert len(after["aclr"]) == 2
    assert after["aclr_db"] == pytest.approx(before["aclr_db"], abs=0.5)
    assert after["mask"]["is_kept"]
    assert after["occupied_bandwidth_hz"] == pytest.approx(72 * 15e3, rel=0.03)
    json.dumps(clipped, allow_nan=False)


def test_each_group_with_its_own_limit(clipped):
    (source,) = clipped["after"]["evm"]
    limits = {item["constellation"]: item["limit_percent"] for item in source["classes"]}
    assert limits == {"qpsk": 17.5, "64qam": 8}
    assert all(item["peak_percent"] > item["percent"] for item in source["classes"])


def test_a_recipe_without_distortion_has_one_side():
    loaded = load_text(CELL, name="cell")
    found = recipe_fidelity(loaded)
    assert not found.has_two
    assert fidelity_document(loaded, found)["after"] is None


def test_channels_that_are_not_held():
    narrow = "sample_rate=1.92 MHz"
    found = recipe_fidelity(load_text(CELL, overrides=[narrow, "signal.edge_window=8/512"]))
    assert found.before.fidelity.aclr is None
    assert any("no ACLR" in note.text for note in found.notes)
    with pytest.raises(SignalError):
        recipe_fidelity(load_text(CELL, overrides=[narrow]), FidelityRequest(must_hold=True))


def test_a_fault_says_where():
    text = CELL + "stages: [{kind: clip, ceiling: 0.1 dB}, {kind: saleh, input_back_off: -20 dB}]\n"
    bad = text.replace("signal:\n  kind: ofdm", "signal:\n  kind: ofdm", 1)
    bad = bad.replace("{kind: clip, ceiling: 0.1 dB}", "{kind: peak_windowing, ceiling: 0.1 dB}")
    with pytest.raises(RecipeError) as refused:
        recipe_fidelity(load_text(bad, name="cell"))
    assert refused.value.where.startswith("cell.yaml:")


def test_the_recipe_has_a_mask_of_its_own():
    text = CELL + (
        "mask: {points: [{offset: 1 MHz, level: -30 dB}, {offset: 3 MHz, level: -40 dB}], "
        "measurement_bandwidth: 100 kHz}\n"
    )
    own = recipe_fidelity(load_text(text)).before.fidelity.mask
    given = recipe_fidelity(load_text(CELL), FidelityRequest(mask=MASK)).before.fidelity.mask
    assert own == given
    assert recipe_fidelity(load_text(CELL)).before.fidelity.mask is None
