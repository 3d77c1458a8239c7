import errno
import os

import pytest

from wavegen.core.errors import FileError
from wavegen.files.faults import os_fault, read_head, regular_size, told


@pytest.mark.parametrize(
    ("number", "word"),
    [
        (errno.ENOENT, "no such file"),
        (errno.EACCES, "permission"),
        (errno.ENOSPC, "full"),
        (errno.EROFS, "read-only"),
        (errno.ENAMETOOLONG, "too long"),
        (errno.EIO, os.strerror(errno.EIO)),
    ],
)
def test_what_the_system_says_is_told_in_our_words(tmp_path, number, word):
    path = tmp_path / "x"
    fault = os_fault(path, OSError(number, os.strerror(number)))
    assert fault.where == str(path)
    assert word in fault.problem
    assert fault.allowed
    assert fault.remedy


def test_other_errors_pass(tmp_path):
    with pytest.raises(ValueError, match="invalid literal"), told(tmp_path):
        int("x")


def test_sizes_of_ordinary_files_only(tmp_path):
    path = tmp_path / "x"
    path.write_bytes(b"12345")
    assert regular_size(path) == 5
    assert read_head(path, 3) == b"123"
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    for other, word in ((tmp_path, "folder"), (pipe, "pipe"), (tmp_path / "none", "no such")):
        with pytest.raises(FileError) as caught:
            read_head(other)
        assert caught.value.where == str(other)
        assert word in caught.value.problem
