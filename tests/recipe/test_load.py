"""A file to a checked recipe: guards, places, and errors from later that find their line."""

import hashlib
from pathlib import Path

import pytest

from wavegen.core.errors import RecipeError, RecipeFaults
from wavegen.recipe.load import LARGEST_BYTES, LoadedRecipe, load_recipe, load_text
from wavegen.recipe.tables import Tables
from wavegen.recipe.tree import Place

TEXT = """\
wavegen: 1
sample_rate: 10 MHz
duration: 1 ms
signal:
  kind: several
  parts:
    - signal: {kind: carrier, symbol_rate: 1 MHz}
    - signal:
        kind: carrier
        symbol_rate: 2 MHz
      level: -3 dB
"""


@pytest.fixture
def loaded(tables: Tables) -> LoadedRecipe:
    return load_text(TEXT, tables=tables, overrides=["seed=4"], name="two")


def test_what_is_loaded(loaded: LoadedRecipe) -> None:
    assert loaded.recipe.sample_rate_hz == 10**7
    assert loaded.recipe.seed == 4
    assert loaded.text == TEXT
    assert loaded.sha256 == hashlib.sha256(TEXT.encode()).hexdigest()
    assert loaded.overrides == ("seed=4",)
    assert loaded.name == "two"
    assert loaded.folder == Path()


@pytest.mark.parametrize(
    ("path", "place"),
    [
        ("wavegen", Place(1, 10)),
        ("signal", Place(4, 1)),
        ("signal.parts", Place(6, 3)),
        ("signal.parts[0]", Place(7, 7)),
        ("signal.parts[0].signal", Place(7, 15)),
        ("signal.parts[0].signal.symbol_rate", Place(7, 44)),
        ("signal.parts[1].signal.symbol_rate", Place(10, 22)),
        ("signal.parts[1].signal.pulse.roll_off", Place(8, 7)),  # defaults: the nearest ancestor
        ("signal.parts[7].level", Place(6, 3)),
        ("output.iq[0]", Place(1, 1)),
        ("", Place(1, 1)),
        ("...[[", Place(1, 1)),
        ("seed", Place(1, 1, "seed")),
    ],
)
def test_places(loaded: LoadedRecipe, path: str, place: Place) -> None:
    assert loaded.place(path) == place


def error(where: str) -> RecipeError:
    return RecipeError(where=where, problem="p", allowed="a", remedy="r")


def test_later_errors_find_their_line(loaded: LoadedRecipe) -> None:
    found = loaded.resolve(error("signal.parts[1].level"))
    assert found.where == "two.yaml:11:14: signal.parts[1].level"
    assert (found.problem, found.allowed, found.remedy) == ("p", "a", "r")
    assert loaded.resolve(error("seed")).where == "--set seed"
    assert loaded.resolve(found) is found
    assert loaded.resolve(error("--set seed")).where == "--set seed"


def test_several_later_errors_find_their_lines(loaded: LoadedRecipe) -> None:
    found = loaded.resolve(RecipeFaults([error("signal"), error("duration")]))
    assert isinstance(found, RecipeFaults)
    assert [one.where for one in found.faults] == [
        "two.yaml:4:1: signal",
        "two.yaml:3:11: duration",
    ]


@pytest.mark.parametrize(
    ("data", "place", "word"),
    [
        (b"\xff\xfe", ":1:1", "UTF-8"),
        (b"wavegen: 1\ntitle: caf\xe9\n", ":2:11", "UTF-8"),
        ("wavegen: 1".encode("utf-16"), ":1:1", "UTF-8"),
        (b"wavegen: 1\n\x00", ":2:1", "YAML"),
        (b"", ":1:1", "nothing"),
        (b"\xef\xbb\xbf", ":1:1", "nothing"),
        (b"x: 1\n" * (LARGEST_BYTES // 5 + 1), "", "larger"),
        (b"[" * LARGEST_BYTES, ":1:41", "levels"),
    ],
)
def test_files_that_are_no_recipe(tmp_path: Path, data: bytes, place: str, word: str) -> None:
    path = tmp_path / "x.yaml"
    path.write_bytes(data)
    with pytest.raises(RecipeError) as caught:
        load_recipe(path)
    assert caught.value.where == f"{path}{place}"
    assert word in f"{caught.value.problem} | {caught.value.allowed}"


@pytest.mark.parametrize("name", ["none.yaml", "", "a\0b", "x" * 5000])
def test_files_that_cannot_be_read(tmp_path: Path, name: str) -> None:
    with pytest.raises(RecipeError) as caught:
        load_recipe(f"{tmp_path}/{name}")
    assert caught.value.remedy == "Check the path."


@pytest.mark.parametrize("name", ["..yaml", "...yaml", " .yaml"])
def test_a_file_whose_stem_names_no_folder(tmp_path: Path, name: str) -> None:
    path = tmp_path / name
    path.write_text("wavegen: 1\n")
    with pytest.raises(RecipeError) as caught:
        load_recipe(path)
    assert caught.value.remedy == "Rename the file."


def test_a_byte_order_mark_and_foreign_line_ends_pass(tables: Tables) -> None:
    loaded = load_text("\ufeff" + TEXT.replace("\n", "\r\n"), tables=tables)
    assert loaded.text.startswith("wavegen")
    assert loaded.place("signal.parts[1].level") == Place(11, 14)
    assert loaded.place("wavegen") == Place(1, 10)


def test_text_with_half_a_surrogate_pair_is_told(tables: Tables) -> None:
    with pytest.raises(RecipeError):
        load_text("title: \ud800", tables=tables)


def test_aliases_stand_for_whole_values(tables: Tables) -> None:
    text = TEXT.replace("- signal: {", "- signal: &a {") + "    - signal: *a\n"
    recipe = load_text(text, tables=tables).recipe
    assert recipe.signal.parts[2] == recipe.signal.parts[0]


def test_json_is_yaml(tables: Tables) -> None:
    text = '{"wavegen": 1, "sample_rate": "1 MHz", "duration": "1 ms", "signal": "choosy"}'
    assert load_text(text, tables=tables).recipe.wavegen == 1


def test_a_real_file_keeps_its_bytes_folder_and_name(tmp_path: Path) -> None:
    head = "wavegen: 1\nsample_rate: 1 MHz\nduration: 1 ms\n"
    text = head + "signal: {kind: noise, bandwidth: 500 kHz}\n"
    path = tmp_path / "field day.yaml"
    path.write_bytes(text.encode())
    loaded = load_recipe(path)
    assert (loaded.name, loaded.folder, loaded.file) == ("field day", tmp_path, str(path))
    assert loaded.sha256 == hashlib.sha256(text.encode()).hexdigest()
    assert type(loaded.recipe.signal).__name__ == "Noise"


def test_faults_beyond_counting_are_counted(tables: Tables) -> None:
    with pytest.raises(RecipeFaults) as caught:
        load_text(TEXT + "".join(f"x{n}: 1\n" for n in range(150)), tables=tables)
    assert len(caught.value.faults) == 101
    assert caught.value.faults[-1].problem == "50 more faults"


def test_a_recipe_shows_itself():
    hostile = "wavegen: 1\ntitle: <script>alert(1)</script> & more\n" + SHOWN
    loaded = load_text(hostile, name="pier", overrides=["duration=1 ms"])
    assert str(loaded).splitlines()[:3] == [
        "<script>alert(1)</script> & more",
        "from pier.yaml",
        "changed: duration=1 ms",
    ]
    assert str(loaded).endswith("spacing: 10 kHz}")
    shown = loaded._repr_html_()
    assert "<script>" not in shown
    assert "<strong>&lt;script&gt;alert(1)&lt;/script&gt; &amp; more</strong>" in shown
    assert "changed: duration=1 ms" in shown
    assert "<pre>wavegen: 1" in shown


SHOWN = """sample_rate: 4 MHz
duration: 2 ms
signal: {kind: tones, count: 8, spacing: 10 kHz}
"""
