"""Markers written and read back, sorted and checked."""

import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import Annotation
from wavegen.files.markers import (
    KINDS,
    SUFFIX,
    checked_markers,
    every,
    marker,
    markers_text,
    read_markers,
)
from wavegen.files.read import open_recording


def test_markers_come_back_in_order(tmp_path):
    markers = [
        marker("burst on", 40, 20),
        marker("slot", 0, 50),
        Annotation(start_sample=7, label='with, comma and "quotes"'),
        marker("period start", 0),
        marker("frame", 0, 100),
    ]
    ordered = checked_markers(markers, n_samples=100, where="output")
    assert [item.start_sample for item in ordered] == [0, 0, 0, 7, 40]
    path = tmp_path / f"run{SUFFIX}"
    path.write_text(markers_text(ordered), encoding="utf-8")
    assert read_markers(path, n_samples=100) == ordered
    assert {item.label for item in ordered} >= set(KINDS)


def test_slots_one_after_another():
    slots = every("slot", 30, 100)
    assert [(item.start_sample, item.n_samples) for item in slots] == [(0, 30), (30, 30), (60, 30)]
    assert every("slot", 101, 100) == ()
    with pytest.raises(ValueError, match="0 samples"):
        every("slot", 0, 100)


@pytest.mark.parametrize(
    ("wrong", "word"),
    [
        (Annotation(start_sample=-1, label="early"), "early"),
        (Annotation(start_sample=100, label="late"), "late"),
        (Annotation(start_sample=90, n_samples=11, label="long"), "90 to 100"),
        (Annotation(start_sample=90, n_samples=0, label="none"), "0 samples"),
        (Annotation(start_sample=0, label="two\nlines"), "printable"),
        (Annotation(start_sample=0, label="x" * 201), "too long"),
        (marker("slot", 5, 5), "twice"),
    ],
)
def test_markers_that_are_refused(wrong, word):
    with pytest.raises(FileError) as caught:
        checked_markers([marker("slot", 5, 5), wrong], n_samples=100, where="output.markers")
    assert caught.value.where == "output.markers"
    assert word in caught.value.problem
    assert "0 to 99" in caught.value.allowed


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("", "first line"),
        ("start,length,name\n1,2,x\n", "first line"),
        ("start_sample,n_samples,label\n1,2\n", "marker 1"),
        ("start_sample,n_samples,label\n,2,x\n", "marker 1"),
        ("start_sample,n_samples,label\n1,2,x\n-1,2,x\n", "marker 2"),
        ("start_sample,n_samples,label\n1.5,2,x\n", "marker 1"),
        ("start_sample,n_samples,label\n1,2,x,y\n", "marker 1"),
        ('start_sample,n_samples,label\n1,2,"x\n', "cannot be read"),
        ("start_sample,n_samples,label\n" + "9" * 30 + ",2,x\n", "marker 1"),
        ("start_sample,n_samples,label\n95,10,x\n", "95 to 104"),
    ],
)
def test_files_of_markers_from_strangers(tmp_path, text, word):
    path = tmp_path / "run.markers.csv"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(FileError) as caught:
        read_markers(path, n_samples=100)
    assert word in caught.value.problem


def test_bytes_that_are_no_text(tmp_path):
    path = tmp_path / "run.markers.csv"
    path.write_bytes(b"start_sample,n_samples,label\n1,2,\xff\n")
    with pytest.raises(FileError):
        read_markers(path, n_samples=100)


def test_comments_and_an_open_length(tmp_path):
    path = tmp_path / "run.markers.csv"
    path.write_text("# made by hand\nStart_Sample, n_samples,label\n3,,x\n", encoding="utf-8")
    assert read_markers(path, n_samples=9) == (Annotation(start_sample=3, label="x"),)


def test_markers_are_no_recording(tmp_path):
    path = tmp_path / "run.markers.csv"
    path.write_text(markers_text([marker("slot", 5, 5)]), encoding="utf-8")
    with pytest.raises(FileError) as caught:
        open_recording(path)
    assert "markers" in caught.value.problem
