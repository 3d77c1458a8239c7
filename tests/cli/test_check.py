import json

import numpy as np
import pytest


@pytest.fixture
def made(call, recipe, tmp_path):
    assert call("make", recipe()).status == 0
    return tmp_path / "output" / "pier"


def scale(folder, factor):
    path = folder / "pier.sigmf-data"
    np.rint(np.fromfile(path, "<i2") * factor).astype("<i2").tofile(path)


def test_match(call, made):
    for path in (made, made / "pier.ccdf.json", made / "pier.sigmf-data", made / "pier"):
        said = call("check", path)
        assert said.status == 0
        assert "Match" in said.out
        assert max(map(len, said.out.splitlines())) <= 80
    document = call("check", made, "--json").json()
    assert document["verdict"] == "match"
    assert document["files"][0]["hash"] == "equal"


def test_differ_and_tolerance(call, made):
    scale(made, 0.5)
    said = call("check", made)
    assert said.status == 5
    assert "DIFFER" in said.out
    assert "-6.02" in said.out
    assert call("check", made, "--json").json()["verdict"] == "differ"
    assert call("check", made, "--tolerance", "6.1dB").status == 0


def test_undecided(call, recipe, tmp_path):
    text = recipe().read_text().replace("duration: 2 ms", "duration: 200 us")
    text = text.replace("4 MHz", "400 kHz")
    (tmp_path / "short.yaml").write_text(text)
    assert call("make", "short.yaml").status == 0
    path = tmp_path / "output" / "short" / "short.sigmf-data"
    rails = np.fromfile(path, "<i2")
    rails[0] += 1
    rails.tofile(path)
    said = call("check", path)
    assert said.status == 6  # 80 samples: eight lie beyond 10 %
    assert "Undecided" in said.out


def test_missing_and_unreadable(call, made):
    (made / "pier.sigmf-data").unlink()
    said = call("check", made, "--json")
    assert said.status == 4
    assert said.json()["files"][0]["hash"] == "missing"
    assert "pier.sigmf-data" in said.err


@pytest.mark.parametrize(
    "text", ["", "{", "[]", "{}", '{"format": "wavegen.ccdf"}', "[" * 100000, "\x00", "null"]
)
def test_sidecars_that_are_none(call, tmp_path, text):
    path = tmp_path / "x.ccdf.json"
    path.write_text(text)
    for subject in (path, tmp_path):
        said = call("check", subject)
        assert said.status == 4
        assert "x.ccdf.json" in said.err
        assert said.out == ""


def test_no_stimulus(call, noise, tmp_path):
    assert call("check", noise()).status == 4
    assert call("check", tmp_path / "missing").status == 4
    assert call("check", tmp_path / "no" / "folder.wav").status == 4


@pytest.mark.parametrize("text", ["-1dB", "0.05", "x", "infdB", "1dBm"])
def test_tolerances_that_are_none(call, made, text):
    assert call("check", made, "--tolerance", text).status == 2


def test_a_sidecar_with_levels_of_another_kind(call, made):
    path = made / "pier.ccdf.json"
    document = json.loads(path.read_text())
    document["files"][0]["levels"] = "none"
    path.write_text(json.dumps(document))
    assert call("check", made).status == 4


def test_a_law_is_asked_again(call, recipe):
    noise = ("--set", "signal={kind: noise, bandwidth: 1 MHz}")
    call("make", recipe(), *noise)
    said = call("check", "output/pier", "--law-tolerance", "1dB", "--down-to", "1%")
    assert said.status == 0
    words = " ".join(said.out.split())
    assert "against its law, measured: agrees within 1 dB down to 1 %" in words
    assert "as its sidecar says" in " ".join(call("check", "output/pier").out.split())


def test_5_where_a_file_differs_from_its_law(call, recipe, tmp_path):
    call(
        "make",
        recipe(),
        "--set",
        "signal={kind: noise, bandwidth: 1 MHz}",
        "--set",
        "duration=20 ms",
    )
    path = tmp_path / "output" / "pier" / "pier.sigmf-data"
    codes = np.fromfile(path, "<i2")
    np.clip(codes, -4000, 4000).tofile(path)
    said = call("check", "output/pier", "--tolerance", "20dB", "--json")
    assert said.json()["differs_from_law"]
    assert said.status == 5
