"""Archives from strangers: every member is looked at, nothing is unpacked."""

import io
import tarfile

import pytest

from wavegen.core.errors import FileError
from wavegen.files.tar import BLOCK, END, entries, header_of, padding


def archive(folder, *members, form=tarfile.PAX_FORMAT, change=None, pax=None):
    path = folder / "x.tar"
    with tarfile.open(path, "w", format=form, pax_headers=pax) as file:
        for name, content in members:
            info = tarfile.TarInfo(name)
            info.size = len(content)
            if change is not None:
                change(info)
            file.addfile(info, io.BytesIO(content))
    return path


@pytest.mark.parametrize("form", [tarfile.USTAR_FORMAT, tarfile.GNU_FORMAT, tarfile.PAX_FORMAT])
def test_plain_archives_of_every_kind(tmp_path, form):
    path = archive(tmp_path, ("a/x.bin", b"12345"), ("./b", bytes(600)), form=form)
    first, second = entries(path)
    assert (first.name, second.name, second.size) == ("a/x.bin", "b", 600)
    content = path.read_bytes()
    assert content[first.start : first.start + first.size] == b"12345"


@pytest.mark.parametrize("form", [tarfile.GNU_FORMAT, tarfile.PAX_FORMAT])
@pytest.mark.parametrize("name", ["long/" + "x" * 180 + ".bin", "größe/µ.bin"])
def test_long_and_foreign_names(tmp_path, form, name):
    (entry,) = entries(archive(tmp_path, (name, b"1"), form=form))
    assert entry.name == name


def test_what_is_written_is_read_by_others(tmp_path):
    path = tmp_path / "x.tar"
    name = "größe/" + "x" * 150
    content = header_of("größe", is_folder=True) + header_of(name, size=5) + b"12345"
    path.write_bytes(content + padding(5) + END)
    with tarfile.open(path, "r:") as file:
        assert file.getnames() == ["größe", name]
        assert file.extractfile(name).read() == b"12345"
        assert file.getmembers()[1].mtime == 0
    assert [item.is_folder for item in entries(path)] == [True, False]


def test_members_beyond_8_gib(tmp_path):
    """A sparse file on the disk, not in the archive: only headers take room."""
    path = tmp_path / "x.tar"
    size = 9 * 2**30
    with path.open("wb") as file:
        file.write(header_of("big", size=size))
        start = file.tell()
        file.seek(size, 1)
        file.write(header_of("small", size=0) + END)
    big, small = entries(path)
    assert (big.start, big.size, small.size) == (start, size, 0)
    with tarfile.open(path, "r:") as file:
        assert file.getmember("big").size == size


def retyped(kind, link=""):
    def change(info):
        info.type = kind
        info.size = 0
        info.linkname = link

    return change


@pytest.mark.parametrize(
    ("name", "word"),
    [
        ("/etc/passwd", "leave"),
        ("../x", "leave"),
        ("a/../../x", "leave"),
        ("a//x", "leave"),
        ("a\\..\\x", "leave"),
        ("C:x", "leave"),
        ("a\nb", "leave"),
    ],
)
def test_names_that_leave(tmp_path, name, word):
    with pytest.raises(FileError) as caught:
        entries(archive(tmp_path, (name, b"1")))
    assert word in caught.value.problem


@pytest.mark.parametrize(
    ("kind", "word"),
    [
        (tarfile.SYMTYPE, "symbolic link"),
        (tarfile.LNKTYPE, "hard link"),
        (tarfile.CHRTYPE, "device"),
        (tarfile.BLKTYPE, "device"),
        (tarfile.FIFOTYPE, "pipe"),
        (tarfile.GNUTYPE_SPARSE, "sparse"),
        (b"Q", "type"),
    ],
)
def test_members_that_are_no_files(tmp_path, kind, word):
    path = tmp_path / "x.tar"
    info = tarfile.TarInfo("x")
    info.type = kind
    info.linkname = "/etc/passwd"
    path.write_bytes(info.tobuf(tarfile.USTAR_FORMAT) + END)
    with pytest.raises(FileError) as caught:
        entries(path)
    assert word in caught.value.problem


def extended(records, *, kind=tarfile.XHDTYPE, size=None):
    content = b"".join(records)
    info = tarfile.TarInfo("extra")
    info.type = kind
    info.size = len(content) if size is None else size
    return info.tobuf(tarfile.USTAR_FORMAT) + content + padding(len(content))


def record(key, value):
    body = f" {key}={value}\n".encode()
    count = len(body) + 2
    count += len(str(count)) - 2
    return str(count).encode() + body


@pytest.mark.parametrize(
    ("front", "word"),
    [
        (extended([record("GNU.sparse.major", "1")]), "sparse"),
        (extended([record("path", "../../x")]), "leave"),
        (extended([record("path", "/x")]), "leave"),
        (extended([record("size", "-5")]), "size"),
        (extended([record("size", "9" * 30)]), "size"),
        (extended([record("size", "100000")]), "100000 bytes"),
        (extended([b"99 path=x\n"]), "damaged"),
        (extended([b"0 path=x\n"]), "damaged"),
        (extended([b"xx path=x\n"]), "damaged"),
        (extended([b"10 pathxx\n"]), "damaged"),
        (extended([record("path", "x")], kind=tarfile.XGLTYPE), "all members"),
        (extended([b"x" * 70_000]), "70000 bytes"),
        (extended([], size=1 << 30), "bytes, "),
        (extended([b"../x\0"], kind=tarfile.GNUTYPE_LONGNAME), "leave"),
    ],
)
def test_extended_headers_that_lie(tmp_path, front, word):
    path = tmp_path / "x.tar"
    path.write_bytes(front + header_of("x", size=5) + b"12345" + padding(5) + END)
    with pytest.raises(FileError) as caught:
        entries(path)
    assert word in caught.value.problem


def test_a_comment_for_all_members_is_passed_over(tmp_path):
    path = archive(tmp_path, ("x", b"1"), pax={"comment": "made on the bench"})
    assert [item.name for item in entries(path)] == ["x"]


def test_twice_the_same_name(tmp_path):
    with pytest.raises(FileError) as caught:
        entries(archive(tmp_path, ("x", b"1"), ("./X", b"2")))
    assert "twice" in caught.value.problem


def test_too_many_members(tmp_path):
    path = tmp_path / "x.tar"
    path.write_bytes(b"".join(header_of(f"x{n}") for n in range(1001)) + END)
    with pytest.raises(FileError) as caught:
        entries(path)
    assert "too many" in caught.value.problem


def test_archives_cut_or_changed_anywhere(tmp_path):
    path = archive(tmp_path, ("a/x", b"12345"), ("b", bytes(600)))
    whole = path.read_bytes()[: 5 * BLOCK]
    n_refused = 0
    for end in range(0, len(whole), 37):
        path.write_bytes(whole[:end])
        try:
            entries(path)
        except FileError:
            n_refused += 1
    for place in range(BLOCK):
        path.write_bytes(whole[:place] + bytes([whole[place] ^ 0x55]) + whole[place + 1 :])
        try:
            entries(path)
        except FileError:
            n_refused += 1
    assert n_refused > BLOCK - 20
