import json


def test_levels_and_peak(call, recipe):
    said = call("predict", recipe())
    assert said.status == 0
    assert "0.0000001 %" in said.out
    assert "highest peak" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_json(call, recipe):
    document = json.loads(call("predict", recipe(), "--json").out)
    assert document["law"]["levels"][0] == {"probability": 0.1, "level_db": 1.9354}
    assert document["no_law"] is None


def test_a_recipe_that_is_missing(call):
    assert call("predict", "nowhere.yaml").status == 3


def test_overrides_count(call, recipe):
    said = call("predict", recipe(), "--set", "signal={kind: tones, count: 2, spacing: 1 MHz}")
    assert "3.01 dB" in said.out
