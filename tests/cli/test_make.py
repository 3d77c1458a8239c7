import json

import pytest

from wavegen.cli.main import run
from wavegen.cli.make import refuse_same_name
from wavegen.core.errors import ArgumentsError


def test_what_it_shows(call, recipe, tmp_path):
    said = call("make", recipe())
    for text in (
        "Pier link, a carrier for the tests",
        "4 MHz",
        "2 ms, 8000 samples",
        "-1.00 dBFS",
        "PAPR between samples",
        "0.1 %",
        "complex Gaussian",
        "agrees with",
        "pier.sigmf-data",
        "pier.sigmf-meta",
    ):
        assert text in said.out
    assert said.err == ""
    assert max(map(len, said.out.splitlines())) <= 80
    assert {path.name for path in (tmp_path / "output" / "pier").iterdir()} == {
        "pier.sigmf-data",
        "pier.sigmf-meta",
        "pier.ccdf.json",
        "pier.ccdf.csv",
        "pier.markers.csv",
    }


def test_json_is_the_sidecar_and_the_folder(call, recipe, tmp_path):
    said = call("make", recipe(), "--json", "--out", "there")
    document = said.json()
    assert document.pop("folder") == "there/pier"
    stored = (tmp_path / "there" / "pier" / "pier.ccdf.json").read_text(encoding="utf-8")
    assert document == json.loads(stored)


def test_keys_of_the_document(call, recipe):
    document = call("make", recipe(), "--json").json()
    for key in ("mean_dbfs", "peak_dbfs", "papr_db", "levels", "ccdf", "law", "files", "warnings"):
        assert key in document
    assert {"probability", "level_db", "resolved"} <= set(document["levels"][0])
    assert {"level_db", "probability"} <= set(document["ccdf"])
    assert {"name", "level_db", "probability", "verdict"} <= set(document["law"])
    assert {
        "name", "format", "datatype", "sha512", "mean_dbfs", "peak_dbfs",
        "peak_between_samples_dbfs", "papr_db", "levels", "ccdf",
    } <= set(document["files"][0])  # fmt: skip


def test_several_recipes_make_one_document(call, recipe, texts):
    first, second = recipe(), recipe(texts.RECIPE.replace("newman", "equal"), "quay.yaml")
    documents = call("make", first, second, "--json").json()
    assert [document["recipe"]["name"] for document in documents] == ["pier", "quay"]


def test_nothing_is_made_if_one_of_them_is_wrong(call, recipe, tmp_path):
    said = call("make", recipe(), recipe("wavegen: 1\n", "quay.yaml"))
    assert said.status == 3
    assert not (tmp_path / "output").exists()


def test_two_recipes_of_one_name_are_refused_before_either_is_made(call, recipe, tmp_path):
    (tmp_path / "sub").mkdir()
    said = call("make", recipe(), recipe(name="sub/Pier.yaml"), "--overwrite")
    assert said.status == 2
    assert not (tmp_path / "output").exists()
    refuse_same_name(["a", "b"])
    with pytest.raises(ArgumentsError):
        refuse_same_name(["a", "b", "a"])


def test_set_changes_the_recipe_and_is_recorded(call, recipe):
    document = call(
        "make", recipe(), "--json", "--set", "signal.count=1", "--set", "output.peak=-3 dBFS"
    ).json()
    assert document["recipe"]["overrides"] == ["signal.count=1", "output.peak=-3 dBFS"]
    assert document["peak_between_samples_dbfs"] == pytest.approx(-3, abs=0.001)
    assert document["papr_db"] == pytest.approx(0, abs=0.001)


def test_what_was_rounded_and_what_is_doubtful_goes_to_stderr(call, recipe):
    said = call(
        "make",
        recipe(),
        "--set",
        "duration=2.0003 ms",
        "--set",
        "output={iq: [{format: raw, datatype: ci8}], average: -30 dBFS}",
    )
    assert said.status == 0
    first, second = said.err.splitlines()
    assert "asked 2.0003 ms, got 2 ms (8000 samples)" in first
    assert "the rounding to ci8" in second
    assert "rounding" not in said.out


def test_json_keeps_talk_off_stdout(call, recipe):
    said = call("make", recipe(), "--set", "duration=2.0003 ms", "--json")
    assert said.json()["rounded"][0]["asked"] == "2.0003 ms"


def test_levels_on_the_bench_stand_with_the_safety_sentence(call, recipe, texts):
    said = call("make", recipe(texts.RECIPE + texts.BENCH.replace("LIMIT", "3")))
    assert said.status == 0
    assert "-10.00 dBm" in said.out
    assert "peak envelope" in said.out
    assert "peak 3 dBm" in said.out
    assert "qualified people" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


@pytest.mark.parametrize("workers", [2, 5])
def test_workers_do_not_change_the_files(call, recipe, workers):
    document = call("make", recipe(), "--json", "--workers", workers).json()
    plain = call("make", recipe(), "--json", "--out", "other").json()
    assert document["files"] == plain["files"]


def test_long_names_stay_within_80_columns(call, recipe):
    name = "a" + "-very-long-name" * 6 + ".yaml"
    said = call("make", recipe(name=name))
    assert said.status == 0
    assert max(map(len, said.out.splitlines())) <= 80


TINY = {
    "a carrier of one sample": ("{kind: carrier}", "1 samples"),
    "one symbol": (
        (
            "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, "
            "pulse: {kind: root_raised_cosine, roll_off: 0.22}}"
        ),
        "1 symbols",
    ),
    "a sum of one part": ("{kind: sum, parts: [{signal: {kind: carrier}}]}", "3 samples"),
    "nested sums": (
        (
            "{kind: sum, parts: [{signal: {kind: sum, parts: [{signal: {kind: noise, "
            "bandwidth: 1 MHz}, level: -200 dB}, {signal: {kind: carrier}}]}}, "
            "{signal: {kind: carrier}, frequency_offset: 2 MHz}]}"
        ),
        "1 ms",
    ),
    "an offset at the lower end": (
        "{kind: sum, parts: [{signal: {kind: carrier}, frequency_offset: -2 MHz}]}",
        "2 samples",
    ),
}


@pytest.mark.parametrize("case", TINY)
def test_small_and_odd_loops(call, recipe, texts, case):
    seed = 2**63 - 1
    signal, duration = TINY[case]
    text = texts.RECIPE.partition("signal:")[0].replace("2 ms", duration)
    said = call("make", recipe(text + f"signal: {signal}\nseed: {seed}\n"), "--json")
    assert said.status == 0, said.err
    assert said.json()["seed"] == seed


@pytest.mark.parametrize("ceiling", ["0.2 dB", "20 dB"])
def test_ceilings_near_both_ends(call, recipe, texts, ceiling):
    text = texts.RECIPE.partition("signal:")[0] + "signal: {kind: noise, bandwidth: 1 MHz}\n"
    said = call("make", recipe(text + f"stages: [{{kind: clip, ceiling: {ceiling}}}]\n"), "--json")
    assert said.status == 0, said.err
    assert said.json()["papr_db"] < float(ceiling[:-3]) + 0.01


NOISE = ("--set", "signal={kind: noise, bandwidth: 1 MHz}")


def test_a_process_is_shown_beside_its_law(call, recipe):
    said = call("make", recipe(), *NOISE, "--tolerance", "1dB", "--down-to", "1%")
    assert said.status == 0
    assert "process, 95 % jointly" in said.out
    assert "agrees with it within 1 dB down to 1 %" in " ".join(said.out.split())
    assert max(map(len, said.out.splitlines())) <= 80


def test_no_law_is_told_by_name(call, recipe):
    stages = ("--set", "stages=[{kind: filter, bandwidth: 500 kHz}]")
    said = call("make", recipe(), *stages)
    assert said.status == 0
    assert "No law: " in said.out


def test_the_best_of_several_seeds(call, recipe):
    said = call("make", recipe(), *NOISE, "--best-of", "4", "--down-to", "1%")
    assert said.status == 0
    assert "of 1 to 4: its levels lie within" in " ".join(said.out.split())
    document = call(
        "make", recipe(), *NOISE, "--best-of", "4", "--down-to", "1%", "--overwrite", "--json"
    ).json()
    assert document["best_of"]["n_tried"] == 4
    assert document["seed"] == document["best_of"]["chosen_seed"]


def test_the_best_of_what_is_alike_is_refused(call, recipe, tmp_path):
    said = call("make", recipe(), "--best-of", "4")
    assert said.status == 2
    assert "--best-of" in said.err
    assert not (tmp_path / "output").exists()


@pytest.mark.parametrize(
    "given", [("--tolerance", "0dB"), ("--down-to", "50%"), ("--best-of", "1")]
)
def test_questions_that_mean_nothing(call, recipe, given):
    assert call("make", recipe(), *given).status == 2


def test_pictures_a_page_and_a_bench_sheet_on_request(tmp_path, capsys):
    words = ["make", "ferry-two-carriers", "--set", "duration=1 ms", "--out", str(tmp_path)]
    assert run([*words, "--report", "--bench-sheet"]) == 0
    said = capsys.readouterr().out
    assert "ferry-two-carriers.bench.html" in said.replace("\n", "").replace(" ", "")
    folder = tmp_path / "ferry-two-carriers"
    assert (folder / "ferry-two-carriers.report.html").is_file()
    assert run([*words, "--report"]) == 4
    assert run([*words, "--overwrite", "--accept-risk", "cable.average_limit"]) == 2
    assert "cable.peak_limit" in capsys.readouterr().err
