"""Files written whole or not at all: temporary names, flush, rename."""

from __future__ import annotations

import os
import re
import secrets
import unicodedata
from pathlib import Path
from types import TracebackType
from typing import Self

from wavegen.core.errors import FileError
from wavegen.files.faults import os_fault, told

_RESERVED = frozenset(
    ["con", "prn", "aux", "nul"]
    + [f"{port}{number}" for port in ("com", "lpt") for number in range(1, 10)]
)
"""Device names on some systems, with any ending: a file of that name cannot be copied there."""

_FORBIDDEN = frozenset('/\\:*?"<>|')
"""Separators, and what common file systems refuse."""

_DRAFT = re.compile(r"\.(.+)\.[0-9a-f]{12}\.part", re.DOTALL)
"""How :class:`Drafts` names a file that is not finished."""

_LONGEST = 200
"""Bytes of a name; file systems hold 255, and temporaries add 23."""


def check_name(name: str, where: str = "name") -> str:
    """Return a file name that cannot leave its folder and is legal everywhere.

    Parameters
    ----------
    name : str
        One path component.
    where : str
        What the message calls it.

    Raises
    ------
    FileError
        Empty, hidden, reserved, too long, or with separators or control characters.

    Examples
    --------
    >>> check_name("run7.sigmf-data")
    'run7.sigmf-data'
    """
    problem = _fault_of(name)
    if problem:
        raise FileError(
            where=where,
            problem=f"{name!r} {problem}",
            allowed=f'a plain file name of up to {_LONGEST} bytes without / \\ : * ? " < > |',
            remedy="Use letters, digits, '-', '_' and '.' inside.",
        )
    return name


def _fault_of(name: str) -> str | None:
    if not name:
        return "is empty"
    length = len(name.encode("utf-8", "replace"))
    faults = (
        (name.startswith("."), "starts with a dot"),
        (name[-1] in ". " or name[0] == " ", "starts with a space or ends in a dot or a space"),
        (_FORBIDDEN & set(name), "holds a separator or a character that file systems refuse"),
        (
            any(unicodedata.category(letter) in {"Cc", "Cs"} for letter in name),
            "holds a control character",
        ),
        (
            name.partition(".")[0].rstrip(" ").casefold() in _RESERVED,
            "is a device's name on some systems",
        ),
        (length > _LONGEST, f"is {length} bytes long"),
    )
    return next((problem for is_faulty, problem in faults if is_faulty), None)


def final_name(draft: Path) -> str:
    """Return the name that a file of :class:`Drafts` will have; any other file's own name.

    Examples
    --------
    >>> final_name(Path("out/.run.sigmf.0123456789ab.part")), final_name(Path("run.sigmf"))
    ('run.sigmf', 'run.sigmf')
    """
    found = _DRAFT.fullmatch(draft.name)
    return found[1] if found else draft.name


class Drafts:
    """A set of new files in one folder that appear together, or none of them.

    Used as a context: leaving it normally flushes and renames all; leaving it by any
    exception (an interrupt too) removes all temporaries and leaves the folder as it was.

    Parameters
    ----------
    folder : Path
        Where the files go; made, with its parents, if missing.
    overwrite : bool
        Whether files that exist are replaced.

    Raises
    ------
    FileError
        The folder is no folder or cannot be written.

    Notes
    -----
    No operating system renames several files in one step: if a rename fails half-way, those
    already done are taken back, and replaced files are put back from their set-aside names.
    Only a power cut between two renames can leave a part, and then each file is whole.
    """

    def __init__(self, folder: Path, *, overwrite: bool = False) -> None:
        self.folder = Path(folder)
        self._overwrite = overwrite
        self._drafts: dict[str, Path] = {}
        self._made: list[Path] = []
        self._token = secrets.token_hex(6)

    def __enter__(self) -> Self:
        """Make the folder if needed, and return itself."""
        if self.folder.exists() and not self.folder.is_dir():
            raise FileError(
                where=str(self.folder),
                problem="is a file, not a folder",
                allowed="a folder for the output",
                remedy="Choose another output folder.",
            )
        try:
            self._make_folder()
        except OSError as error:
            self._unmake_folder()
            raise os_fault(self.folder, error) from error
        if not os.access(self.folder, os.W_OK | os.X_OK):
            raise FileError(
                where=str(self.folder),
                problem="cannot be written",
                allowed="a folder you may write to",
                remedy="Change its permissions or choose another output folder.",
            )
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        """Rename all, or remove all."""
        if kind is not None:
            self._discard()
            return
        try:
            self._commit()
        except BaseException:
            self._discard()
            raise

    def add(self, name: str) -> Path:
        """Return the temporary path of a new file, empty and made for us alone.

        Parameters
        ----------
        name : str
            Its name in the folder; see :func:`check_name`.

        Raises
        ------
        FileError
            A bad name, the same name twice, a file that exists (unless it may be replaced),
            or a folder of that name.
        """
        check_name(name, where=str(self.folder))
        if any(name.casefold() == known.casefold() for known in self._drafts):
            raise FileError(
                where=str(self.folder / name),
                problem="would be written twice",
                allowed="every output file once (upper and lower case are the same here)",
                remedy="Drop one of the outputs or rename it.",
            )
        self._refuse_existing(name)
        draft = self.folder / f".{name}.{self._token}.part"
        with told(draft):
            handle = os.open(draft, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666)
        os.close(handle)
        self._drafts[name] = draft
        return draft

    def _refuse_existing(self, name: str) -> None:
        final = self.folder / name
        if final.is_dir() and not final.is_symlink():
            raise FileError(
                where=str(final),
                problem="is a folder",
                allowed="a name that is free, or that of a file",
                remedy="Move the folder or choose another name.",
            )
        if os.path.lexists(final) and not self._overwrite:
            raise FileError(
                where=str(final),
                problem="exists already",
                allowed="new names; a file that exists is kept",
                remedy="Give --overwrite to replace it, or choose another output folder.",
            )

    def _make_folder(self) -> None:
        missing = [path for path in (self.folder, *self.folder.parents) if not path.exists()]
        for path in reversed(missing):
            try:
                path.mkdir(exist_ok=True)
            except FileNotFoundError as error:  # some file systems say so of what they refuse
                raise FileError(
                    where=str(path),
                    problem="this folder cannot be made",
                    allowed="folders on a file system that takes new ones",
                    remedy="Choose another output folder.",
                ) from error
            self._made.append(path)

    def _unmake_folder(self) -> None:
        for path in reversed(self._made):
            try:
                path.rmdir()
            except OSError:  # somebody else has put something there
                return

    def _discard(self) -> None:
        for draft in self._drafts.values():
            draft.unlink(missing_ok=True)
        self._unmake_folder()

    def _commit(self) -> None:
        for name, draft in self._drafts.items():
            self._refuse_existing(name)
            with told(self.folder / name):
                _flush(draft)
        aside: list[tuple[Path, Path]] = []
        placed: list[Path] = []
        try:
            for name in self._drafts:
                final = self.folder / name
                with told(final):
                    if os.path.lexists(final):
                        kept = self.folder / f".{name}.{self._token}.kept"
                        aside.append((kept, final))
                        final.replace(kept)
            for name, draft in self._drafts.items():
                final = self.folder / name
                with told(final):
                    placed.append(final)
                    draft.rename(final)
        except BaseException:
            _take_back(aside, placed, self._drafts)
            raise
        for kept, _ in aside:
            kept.unlink(missing_ok=True)
        _flush_folder(self.folder)


def _take_back(aside: list[tuple[Path, Path]], placed: list[Path], drafts: dict[str, Path]) -> None:
    for final in placed:
        if not drafts[final.name].exists():  # its rename was done
            final.unlink(missing_ok=True)
    for kept, final in aside:
        if os.path.lexists(kept):
            kept.replace(final)


def _flush(path: Path) -> None:
    handle = os.open(path, os.O_RDWR)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def _flush_folder(folder: Path) -> None:
    """Flush the directory entries where the system lets a folder be opened."""
    try:
        handle = os.open(folder, os.O_RDONLY)
    except OSError:  # some systems do not open folders
        return
    try:
        os.fsync(handle)
    except OSError:  # some file systems do not flush folders
        return
    finally:
        os.close(handle)
