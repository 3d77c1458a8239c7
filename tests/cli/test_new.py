import pytest

from wavegen.recipe.find import shipped_recipes

NAME = "harbour-link-qpsk"


def source():
    return next(path for name, _, path in shipped_recipes() if name == NAME)


def test_a_copy_to_edit(call, tmp_path):
    said = call("new", NAME)
    assert said.status == 0
    assert (tmp_path / f"{NAME}.yaml").read_bytes() == source().read_bytes()
    assert f"wavegen make {NAME}.yaml" in said.out
    assert said.err == ""
    assert [path.name for path in tmp_path.iterdir()] == [f"{NAME}.yaml"]
    assert max(map(len, said.out.splitlines())) <= 80


def test_under_another_name_and_as_json(call, tmp_path):
    document = call("new", f"{NAME}.yaml", "--as", "sub/mine.yml", "--json").json()
    assert document["recipe"] == NAME
    assert document["file"] == "sub/mine.yml"
    assert document["title"]
    assert (tmp_path / "sub" / "mine.yml").read_bytes() == source().read_bytes()


def test_a_file_that_exists_is_kept(call, tmp_path):
    mine = tmp_path / f"{NAME}.yaml"
    mine.write_text("mine\n")
    said = call("new", NAME)
    assert said.status == 4
    assert "--overwrite" in said.err
    assert mine.read_text() == "mine\n"
    assert call("new", NAME, "--overwrite").status == 0
    assert mine.read_bytes() == source().read_bytes()


@pytest.mark.parametrize(
    ("name", "word"),
    [("harbour-link-qpks", NAME), ("", "list recipes"), ("../x", "shipped"), ("x" * 5000, "such")],
)
def test_no_such_recipe(call, tmp_path, name, word):
    said = call("new", name)
    assert said.status == 3
    assert word in said.err
    assert list(tmp_path.iterdir()) == []


def test_a_local_file_of_that_name_is_not_copied_onto_itself(call, tmp_path):
    (tmp_path / "mine.yaml").write_text("wavegen: 1\n")
    assert call("new", "mine.yaml").status == 3


@pytest.mark.parametrize("target", ["mine", "mine.txt", "..", "."])
def test_no_name_of_a_recipe(call, target):
    said = call("new", NAME, "--as", target)
    assert said.status == 2
    assert "--as" in said.err


def test_a_folder_that_cannot_be(call, tmp_path):
    (tmp_path / "file").write_text("")
    assert call("new", NAME, "--as", "file/mine.yaml").status == 4
    (tmp_path / "dir.yaml").mkdir()
    assert call("new", NAME, "--as", "dir.yaml", "--overwrite").status == 4
