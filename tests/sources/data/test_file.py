from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.site import Site
from wavegen.sources.data import file as module
from wavegen.sources.data.file import File


def site(folder):
    return Site(
        sample_rate_hz=Fraction(1), n_samples=10, seed=1, label="a", path="signal", folder=folder
    )


def words(folder, name, *, n_bits=1, period=8, label=""):
    return File(path=name).bind(site(folder), n_bits=n_bits, period=period, label=label)


def test_text_and_packed_bits(tmp_path):
    (tmp_path / "bits.txt").write_text("1, 0 1;1\r\n\t0010\n")
    (tmp_path / "bits.BIN").write_bytes(bytes([0b10110010]))
    for name in ("bits.txt", "bits.BIN"):
        assert words(tmp_path, name).words(0, 8).tolist() == [1, 0, 1, 1, 0, 0, 1, 0]
        assert File(path=name).period_bits(tmp_path) == 8


def test_the_bits_repeat_and_a_cut_is_noted(tmp_path):
    (tmp_path / "bits.txt").write_text("100")
    here = site(tmp_path)
    made = File(path="bits.txt").bind(here, n_bits=2, period=4)
    assert made.words(0, 4).tolist() == [2, 1, 0, 2]
    assert len(here.notes) == 1


@pytest.mark.parametrize(
    ("name", "content", "problem"),
    [
        ("bits.txt", b"01\n0x1\n", "line 2 holds 'x'"),
        ("bits.txt", "0\u00b51".encode(), "line 1"),
        ("bits.txt", b" \n,", "no bits"),
        ("bits.bin", b"", "no bits"),
        ("missing.txt", None, "no file"),
        ("bad\0name", None, "no"),
    ],
)
def test_refused(tmp_path, name, content, problem):
    if content is not None:
        (tmp_path / name).write_bytes(content)
    with pytest.raises(RecipeError) as caught:
        words(tmp_path, name, label=".groups[0]")
    assert caught.value.where == "signal.groups[0].data.path"
    assert problem in caught.value.problem


def test_a_folder_is_no_file(tmp_path):
    with pytest.raises(RecipeError) as caught:
        words(tmp_path.parent, tmp_path.name)
    assert "is no file" in caught.value.problem


@pytest.mark.parametrize(("bits", "size"), [(8, 1000), (1000, 8)])
def test_too_large(tmp_path, monkeypatch, bits, size):
    monkeypatch.setattr(module, "MOST_BITS", bits)
    monkeypatch.setattr(module, "MOST_BYTES", size)
    (tmp_path / "bits.txt").write_text("01" * 10)
    with pytest.raises(RecipeError) as caught:
        words(tmp_path, "bits.txt")
    assert caught.value.where == "signal.data.path"


def test_words_are_exact(tmp_path):
    bits = np.random.default_rng(1).integers(0, 2, 999)
    (tmp_path / "bits.txt").write_text("\n".join(map(str, bits)))
    made = words(tmp_path, "bits.txt", n_bits=3, period=333)
    assert np.array_equal(made.words(0, 333), bits.reshape(-1, 3) @ [4, 2, 1])
