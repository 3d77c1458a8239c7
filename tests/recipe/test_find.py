"""Recipes by path or shipped name."""

from pathlib import Path

import pytest

from wavegen.core.errors import RecipeError
from wavegen.recipe import find
from wavegen.recipe.find import find_recipe, shipped_folder, shipped_recipes


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    made = tmp_path / "recipes"
    made.mkdir()
    (made / "quiet-lane.yaml").write_text("wavegen: 1\ntitle: A quiet lane\n")
    (made / "busy-road.yaml").write_text("title: [x\n")
    (made / "notes.txt").write_text("x")
    monkeypatch.setattr(find, "shipped_folder", lambda: made)
    monkeypatch.chdir(tmp_path)
    return made


def test_shipped_recipes_by_name(folder: Path) -> None:
    assert shipped_recipes() == [
        ("busy-road", "", folder / "busy-road.yaml"),
        ("quiet-lane", "A quiet lane", folder / "quiet-lane.yaml"),
    ]
    assert find_recipe("quiet-lane") == folder / "quiet-lane.yaml"
    assert find_recipe("quiet-lane.yaml") == folder / "quiet-lane.yaml"


def test_a_path_comes_first(folder: Path, tmp_path: Path) -> None:
    mine = tmp_path / "quiet-lane.yaml"
    mine.write_text("wavegen: 1\n")
    assert find_recipe("quiet-lane.yaml") == Path("quiet-lane.yaml")
    assert find_recipe(mine) == mine
    assert find_recipe("quiet-lane") == folder / "quiet-lane.yaml"


@pytest.mark.parametrize(
    ("name", "guess"),
    [
        ("quiet-lan", "quiet-lane"),
        ("quietlane.yaml", "quiet-lane"),
        ("elsewhere/busy-rod.yaml", "busy-road"),
        ("../recipes/notes", None),
        ("zzz", None),
        ("", None),
        ("a\0b", None),
        ("x" * 9999, None),
    ],
)
@pytest.mark.usefixtures("folder")
def test_what_is_missing_names_the_nearest(name: str, guess: str | None) -> None:
    with pytest.raises(RecipeError) as caught:
        find_recipe(name)
    assert "quiet-lane" in caught.value.allowed
    wanted = f"Did you mean {guess}?" if guess else "Check the path."
    assert caught.value.remedy == wanted


def test_a_checkout_has_its_recipes_beside_the_package() -> None:
    assert shipped_folder().name == "recipes"
    assert shipped_folder().is_dir()


@pytest.mark.usefixtures("folder")
def test_a_name_without_its_ending_beside_the_file_is_told(tmp_path: Path) -> None:
    (tmp_path / "mine.yaml").write_text("wavegen: 1\n")
    with pytest.raises(RecipeError) as caught:
        find_recipe("mine")
    assert caught.value.where == "mine"
    assert "mine.yaml" in caught.value.remedy
