import os
from pathlib import Path

import pytest

from wavegen.core.errors import FileError
from wavegen.files.atomic import Drafts, check_name


def write(folder, *files, overwrite=False, then=lambda: None):
    with Drafts(folder, overwrite=overwrite) as drafts:
        for name in files:
            drafts.add(name).write_bytes(b"new")
        then()


def fail(error):
    raise error


def names(folder):
    return sorted(path.name for path in folder.iterdir())


def test_files_appear_together_at_the_end(tmp_path):
    with Drafts(tmp_path) as drafts:
        first, second = drafts.add("a.wav"), drafts.add("b.json")
        first.write_bytes(b"1")
        second.write_bytes(b"2")
        assert {first.parent, second.parent} == {tmp_path}
        assert not (tmp_path / "a.wav").exists()
    assert names(tmp_path) == ["a.wav", "b.json"]
    assert (tmp_path / "b.json").read_bytes() == b"2"


@pytest.mark.parametrize("error", [ValueError, KeyboardInterrupt, SystemExit])
def test_nothing_is_left_after_an_exception(tmp_path, error):
    folder = tmp_path / "new" / "deep"
    with pytest.raises(error):
        write(folder, "a.wav", then=lambda: fail(error))
    assert names(tmp_path) == []


def test_a_folder_that_was_there_stays(tmp_path):
    (tmp_path / "other.txt").write_text("x")
    with pytest.raises(ValueError, match="stop"):
        write(tmp_path, "a.wav", then=lambda: fail(ValueError("stop")))
    assert names(tmp_path) == ["other.txt"]


def test_existing_files_are_kept_unless_told(tmp_path):
    (tmp_path / "a.wav").write_bytes(b"old")
    with pytest.raises(FileError) as caught:
        write(tmp_path, "new.wav", "a.wav")
    assert caught.value.where == str(tmp_path / "a.wav")
    assert "--overwrite" in caught.value.remedy
    assert names(tmp_path) == ["a.wav"]
    write(tmp_path, "a.wav", overwrite=True)
    assert names(tmp_path) == ["a.wav"]
    assert (tmp_path / "a.wav").read_bytes() == b"new"


def test_a_file_that_appears_meanwhile_is_kept(tmp_path):
    final = tmp_path / "a.wav"
    with pytest.raises(FileError) as caught:
        write(tmp_path, "a.wav", then=lambda: final.write_bytes(b"theirs"))
    assert "--overwrite" in caught.value.remedy
    assert names(tmp_path) == ["a.wav"]
    assert final.read_bytes() == b"theirs"


@pytest.mark.parametrize("error", [OSError(28, "No space left on device"), KeyboardInterrupt()])
def test_a_rename_that_fails_half_way_is_taken_back(tmp_path, monkeypatch, error):
    (tmp_path / "b.wav").write_bytes(b"old")
    plain = Path.rename

    def rename(self, target):
        if Path(target).name == "b.wav":
            raise error
        return plain(self, target)

    monkeypatch.setattr(Path, "rename", rename)
    with pytest.raises((FileError, KeyboardInterrupt)) as caught:
        write(tmp_path, "a.wav", "b.wav", "c.wav", overwrite=True)
    assert names(tmp_path) == ["b.wav"]
    assert (tmp_path / "b.wav").read_bytes() == b"old"
    if isinstance(error, OSError):
        assert caught.value.where == str(tmp_path / "b.wav")
        assert "full" in caught.value.problem


def test_the_same_name_twice(tmp_path):
    with pytest.raises(FileError) as caught:
        write(tmp_path, "a.wav", "A.WAV")
    assert "twice" in caught.value.problem
    assert names(tmp_path) == []


def test_a_folder_in_the_way(tmp_path):
    (tmp_path / "a.wav").mkdir()
    with pytest.raises(FileError) as caught:
        write(tmp_path, "a.wav", overwrite=True)
    assert caught.value.where == str(tmp_path / "a.wav")
    assert names(tmp_path) == ["a.wav"]


def test_a_link_is_replaced_and_its_target_kept(tmp_path):
    folder, outside = tmp_path / "out", tmp_path / "precious.wav"
    folder.mkdir()
    outside.write_bytes(b"precious")
    (folder / "a.wav").symlink_to(outside)
    with pytest.raises(FileError):
        write(folder, "a.wav")
    write(folder, "a.wav", overwrite=True)
    assert outside.read_bytes() == b"precious"
    assert (folder / "a.wav").read_bytes() == b"new"
    assert not (folder / "a.wav").is_symlink()


def test_the_folder_is_a_file(tmp_path):
    path = tmp_path / "file"
    path.write_text("x")
    for folder in (path, path / "below"):
        with pytest.raises(FileError) as caught:
            write(folder)
        assert caught.value.where == str(folder)
    assert names(tmp_path) == ["file"]


def test_a_folder_that_cannot_be_written(tmp_path, monkeypatch):
    monkeypatch.setattr(os, "access", lambda *_: False)
    with pytest.raises(FileError) as caught:
        write(tmp_path)
    assert caught.value.where == str(tmp_path)
    assert "written" in caught.value.problem


@pytest.mark.parametrize(
    "name",
    [
        "",
        ".",
        "..",
        ".hidden",
        "../a.wav",
        "a/b.wav",
        "/etc/passwd",
        "a\\b.wav",
        "C:a.wav",
        "a\0b",
        "a\nb",
        "con",
        "NUL.wav",
        "lpt1.sigmf-data",
        "a.wav.",
        "a ",
        " a",
        "x" * 201,
        "é" * 101,
        "a?b",
        "a\x1b[31m",
        "a\udcff",
    ],
)
def test_names_that_could_leave_the_folder_or_trouble_a_system(tmp_path, name):
    with pytest.raises(FileError) as caught:
        check_name(name, where="output")
    assert caught.value.where == "output"
    assert repr(name) in caught.value.problem
    with pytest.raises(FileError):
        write(tmp_path, name)
    assert names(tmp_path) == []


@pytest.mark.parametrize("name", ["a", "run-7_b.ci16_le", "Träger 3.wav", "x" * 200, "console.wav"])
def test_plain_names(tmp_path, name):
    write(tmp_path, name)
    assert names(tmp_path) == [name]


def test_files_have_the_usual_permissions(tmp_path):
    with Drafts(tmp_path) as drafts:
        drafts.add("a.wav").write_bytes(b"1")
    (tmp_path / "plain").write_bytes(b"1")
    assert (tmp_path / "a.wav").stat().st_mode == (tmp_path / "plain").stat().st_mode
