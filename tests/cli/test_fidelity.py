import pytest

CELL = """wavegen: 1
title: Pier cell
sample_rate: 7.68 MHz
duration: 28 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-36..-1, 1..36", constellation: 64qam}
  cyclic_prefix: 36/512
  edge_window: 8/512
stages:
  - {kind: clip_filter, ceiling: 6 dB}
"""
MASK = """points: [{offset: 1 MHz, level: -30 dB}, {offset: 3 MHz, level: -40 dB}]
measurement_bandwidth: 100 kHz
"""


def test_a_table_of_two_sides(call, recipe):
    said = call("fidelity", recipe(CELL), "--limits", "NR BS FR1")
    assert said.status == 0
    assert "of 8 %" in said.out
    assert "occupied bandwidth" in said.out
    assert "before" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_json_with_a_mask_and_own_channels(call, recipe, tmp_path):
    (tmp_path / "mask.yaml").write_text(MASK, encoding="utf-8")
    document = call(
        "fidelity", recipe(CELL), "--json", "--mask", "mask.yaml", "--spread",
        "--channel-bandwidth", "1 MHz", "--channel-spacing", "1.4MHz",
    ).json()  # fmt: skip
    assert document["after"]["mask"]["is_kept"]
    assert [row["offset_hz"] for row in document["after"]["aclr"]] == [-1.4e6, 1.4e6]
    assert document["after"]["evm"][0]["classes"][0]["peak_percent"] > 0


def test_the_definition_of_a_standard(call, recipe):
    said = call("fidelity", recipe(CELL), "--json", "--evm", "3gpp", "--evm-window", "16")
    assert said.json()["after"]["evm"][0]["definition"] == "3gpp"


@pytest.mark.parametrize(
    ("arguments", "status"),
    [
        (["--evm", "3gpp"], 2),
        (["--channels", "NR BS FR11"], 2),
        (["--channels", "NR BS FR1", "--channel-spacing", "5 MHz"], 2),
        (["--mask", "nowhere.yaml"], 4),
        (["--channel-spacing", "5 MHz", "--channel-bandwidth", "4"], 2),
        (["--set", "stages[0].ceiling=7"], 3),
    ],
)
def test_what_is_refused(call, recipe, arguments, status):
    assert call("fidelity", recipe(CELL), *arguments).status == status


def test_a_recipe_that_is_missing(call):
    assert call("fidelity", "nowhere.yaml").status == 3
