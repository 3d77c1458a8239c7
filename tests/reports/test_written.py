"""Pictures and pages as files."""

import pytest

from wavegen.core.errors import FileError
from wavegen.reports.figures.look import new_figure
from wavegen.reports.figures.picture import Picture
from wavegen.reports.pages.page import Page
from wavegen.reports.written import write_page, write_pictures


def picture(name):
    return Picture(name=name, figure=new_figure("T")[0], caption="C", alternative="A")


def test_every_picture_in_both_formats(tmp_path):
    names = write_pictures([picture("a"), picture("b")], tmp_path / "new", "car")
    assert names == ["car.a.svg", "car.a.png", "car.b.svg", "car.b.png"]
    assert sorted(path.name for path in (tmp_path / "new").iterdir()) == sorted(names)


def test_nothing_is_replaced_unasked_and_none_is_left(tmp_path):
    (tmp_path / "car.b.svg").write_text("mine")
    with pytest.raises(FileError):
        write_pictures([picture("a"), picture("b")], tmp_path, "car")
    assert [path.name for path in tmp_path.iterdir()] == ["car.b.svg"]
    write_pictures([picture("b")], tmp_path, "car", overwrite=True)
    assert (tmp_path / "car.b.svg").read_text() != "mine"


def test_a_page_is_one_file(tmp_path):
    page = Page(title="T", summary=("S",), sections=())
    assert write_page(page, tmp_path / "deep" / "x.html") == "x.html"
    assert (tmp_path / "deep" / "x.html").read_text().startswith("<!DOCTYPE html>")
    with pytest.raises(FileError):
        write_page(page, tmp_path / "deep" / "x.html")
