"""What every file format is: facts and codes in, a recording out."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from pathlib import Path
from typing import ClassVar, Protocol

from wavegen.core.errors import FileError
from wavegen.core.registry import nearest
from wavegen.core.signal import Signal
from wavegen.core.units import format_hz
from wavegen.files.datatypes import (
    ALIGNMENTS,
    WORD_BITS,
    Alignment,
    Codes,
    Datatype,
    takes_words,
    word_in,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Annotation:
    """A stretch of samples with a name: a marker, a burst, a slot.

    Parameters
    ----------
    start_sample : int
        First sample of it.
    n_samples : int or None
        Length; None where the file does not say.
    label : str
        Short name (SigMF recommends up to 20 characters).
    comment : str
        Anything longer.
    low_hz, high_hz : float or None
        Band it occupies, both or neither, Hz.
    """

    start_sample: int
    n_samples: int | None = None
    label: str = ""
    comment: str = ""
    low_hz: float | None = None
    high_hz: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class FileFacts:
    """What a writer is told about the waveform before its first sample.

    Parameters
    ----------
    sample_rate_hz : Fraction
        Exact rate, Hz.
    n_samples : int
        How many samples will be written; the writer holds the caller to it.
    datatype : Datatype
        One of the format's.
    title, description : str
        For people; formats without a place for them leave them out.
    generator : str
        Program and version.
    recipe_sha512 : str
        Hex digest of the recipe's text, empty if none.
    annotations : tuple of Annotation
        Markers.
    centre_frequency_hz : float or None
        Radio frequency of the baseband's 0 Hz, Hz.
    extra : mapping
        Further facts for formats with room for them (JSON values; keys are identifiers).
    n_channels : int
        Coherent channels that share the file, interleaved sample by sample.
    """

    sample_rate_hz: Fraction
    n_samples: int
    datatype: Datatype
    title: str = ""
    description: str = ""
    generator: str = "wavegen"
    recipe_sha512: str = ""
    annotations: tuple[Annotation, ...] = ()
    centre_frequency_hz: float | None = None
    extra: Mapping[str, object] = field(default_factory=dict)
    n_channels: int = 1

    @property
    def n_columns(self) -> int:
        """Columns of the codes to come: 2 for each complex channel, 1 for each real one."""
        return self.datatype.n_rails * self.n_channels


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadHints:
    """What the user says about a file that may not say it itself.

    Parameters
    ----------
    format : str or None
        Name of a format (``sigmf``), or of a datatype (``ci16_le``), which means raw.
    datatype : str or None
        Name of a datatype, for files without a header.
    sample_rate_hz : Fraction or None
        Exact rate, Hz. It wins over the file's own, with a warning.
    full_scale : float or None
        Code that is to read as 1.0 in place of the datatype's: 2048 for 12-bit codes in
        16-bit rails, 32768 for float files that hold integers.
    reference_level_dbm : float or None
        Power at 0 dBFS, dBm; carried, not applied.
    bits : int or None
        Bits of the words in 16-bit containers: 12, 14 or 16.
    align : {"left", "right"} or None
        Where shorter words stand; needed with ``bits`` below 16.
    channel : int or None
        Which of several channels, from 0. Files without a header have two if this is given.
    variable : str or None
        Which array of a file that holds several.
    """

    format: str | None = None
    datatype: str | None = None
    sample_rate_hz: Fraction | None = None
    full_scale: float | None = None
    reference_level_dbm: float | None = None
    bits: int | None = None
    align: Alignment | None = None
    channel: int | None = None
    variable: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Recording:
    """A file as the rest of the program sees it.

    Parameters
    ----------
    path : Path
        The data file.
    files : tuple of Path
        Every file of it (SigMF has two).
    format : str
        Name of its format.
    signal : Signal
        The samples, full scale 1.0; small, picklable, reads ranges.
    sample_rate_hz : Fraction
        Rate, Hz.
    n_samples : int
        Length.
    datatype : Datatype
        How samples are coded.
    title, description : str
        What the file says about itself.
    centre_frequency_hz, reference_level_dbm : float or None
        Radio frequency of 0 Hz, Hz; power at 0 dBFS, dBm.
    annotations : tuple of Annotation
        Markers, by start.
    sha512 : str or None
        Digest of the data file that the file states; not checked by reading.
    statistics : mapping or None
        What this program wrote about the samples, if it wrote them.
    warnings : tuple of str
        Legal but doubtful.
    n_channels : int
        Channels in the file, of which ``signal`` is one.
    channel : int
        Which one.
    is_real : bool
        The file holds real samples; ``signal`` is their analytic signal, whose envelope is that
        of the carrier (a real carrier of amplitude A has ``|x| = A``).
    is_power : bool
        The file holds power against time; ``|x|^2`` is that power, the phase is 0 by decree, so
        that spectra and peaks between samples mean nothing.
    data_start, data_bytes : int, int or None
        Where in ``path`` the bytes lie that ``sha512`` is about; None for all of the file.
    """

    path: Path
    files: tuple[Path, ...]
    format: str
    signal: Signal
    sample_rate_hz: Fraction
    n_samples: int
    datatype: Datatype
    title: str = ""
    description: str = ""
    centre_frequency_hz: float | None = None
    reference_level_dbm: float | None = None
    annotations: tuple[Annotation, ...] = ()
    sha512: str | None = None
    statistics: Mapping[str, object] | None = None
    warnings: tuple[str, ...] = ()
    n_channels: int = 1
    channel: int = 0
    is_real: bool = False
    is_power: bool = False
    data_start: int = 0
    data_bytes: int | None = None


class Writer(Protocol):
    """A file being written: blocks of codes, then one finish."""

    def write(self, codes: Codes) -> None:
        """Append codes of the facts' datatype, shape (n, n_columns).

        Raises
        ------
        FileError
            The disk refuses, or more samples than the facts say.
        """

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Complete and close the files.

        Parameters
        ----------
        statistics : mapping or None
            Measured on the codes; formats with room for it store it (JSON values).

        Raises
        ------
        FileError
            Fewer samples than the facts say, or the disk refuses.
        """

    def close(self) -> None:
        """Close the files without completing them; after :meth:`finish` nothing happens."""

    @property
    def sha512(self) -> str:
        """Hex digest of the data file's bytes, once finished."""


class Format(Protocol):
    """What every member of FORMATS is (the class itself is used through an instance)."""

    name: ClassVar[str]
    """Its name in recipes and on the command line."""
    suffixes: ClassVar[tuple[str, ...]]
    """Endings of its files, lower case; the first is the data file's."""
    datatypes: ClassVar[Mapping[str, Datatype]]
    """What can be written, by every name a recipe may use for it."""
    default_datatype: ClassVar[str]
    """Used where a recipe names none."""

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the names of the files that will be made, the data file first."""

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse what this format cannot hold, before anything is written.

        Raises
        ------
        FileError
            At ``where``: a datatype, a rate or a length that the format has no room for.
        """

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Open the (temporary) files, in the order of :meth:`files`."""

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether this is a file of this format, by name and first 4096 bytes."""

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open a file for reading.

        Raises
        ------
        FileError
            Not a file of this format, damaged, or facts missing that hints must give.
        """


def pick_datatype(
    form: Format,
    name: str | None,
    where: str,
    *,
    bits: int | None = None,
    align: str | None = None,
) -> Datatype:
    """Return the datatype that a name means for a format; its default for None.

    Parameters
    ----------
    form : Format
        Who writes it.
    name : str or None
        By any name that the format knows.
    where : str
        For messages.
    bits, align
        As in :func:`told_word`.

    Raises
    ------
    FileError
        At ``where``: the format does not write it, or it holds no such words.
    """
    wanted = name or form.default_datatype
    if wanted in form.datatypes:
        return told_word(form.datatypes[wanted], bits=bits, align=align, where=where)
    guess = nearest(wanted, form.datatypes)
    raise FileError(
        where=where,
        problem=f"{form.name} does not write {wanted!r}",
        allowed=", ".join(form.datatypes),
        remedy=f"Did you mean {guess}?" if guess else f"Use {form.default_datatype}.",
    )


def told_word(datatype: Datatype, *, bits: int | None, align: str | None, where: str) -> Datatype:
    """Return a datatype whose 16-bit containers hold the words that the user states.

    Parameters
    ----------
    datatype : Datatype
        By its container.
    bits : int or None
        Bits of a word: 12, 14 or 16. None: the container is full.
    align : str or None
        ``left`` or ``right``; needed below 16 bits, for the two differ by 12 or 24 dB.
    where : str
        For messages.

    Raises
    ------
    FileError
        At ``where``: no 16-bit integers, other bits, or no or another alignment.
    """
    if bits is None and align is None:
        return datatype
    for is_wrong, problem, allowed, remedy in (
        (
            not takes_words(datatype),
            f"{datatype.name} holds no shorter words",
            "bits and align with 16-bit integers, such as ci16_le",
            "Leave them out, or choose ci16_le.",
        ),
        (
            bits not in WORD_BITS,
            f"words of {bits} bits" if bits is not None else "an alignment without bits",
            f"{', '.join(map(str, WORD_BITS))} bits",
            "State the bits of the converter's words.",
        ),
        (
            align not in ALIGNMENTS and not (align is None and bits == 16),
            f"the alignment is {align!r}" if align is not None else "the alignment is missing",
            " or ".join(ALIGNMENTS),
            "State left if the lowest bits of the container are zero, else right.",
        ),
    ):
        if is_wrong:
            raise FileError(where=where, problem=problem, allowed=allowed, remedy=remedy)
    assert bits is not None  # noqa: S101 - one of WORD_BITS
    return word_in(datatype, bits=bits, align="left" if align == "left" else "right")


def told_channel(path: Path, *, n_channels: int, hints: ReadHints) -> int:
    """Return which channel of a file is meant.

    Raises
    ------
    FileError
        The file has several and none is named, or one that it has not.
    """
    channel = hints.channel
    if channel is None and n_channels == 1:
        return 0
    if channel is None or not 0 <= channel < n_channels:
        asked = "" if channel is None else f", and channel {channel} is asked for"
        raise FileError(
            where=str(path),
            problem=f"has {n_channels} channel{'s' if n_channels > 1 else ''}{asked}",
            allowed="one at a time: " + ("0" if n_channels == 1 else f"0 to {n_channels - 1}"),
            remedy="Add --channel 0, or another." if n_channels > 1 else "Leave --channel out.",
        )
    return channel


def distinct_stems(stem: str, wanted: Iterable[tuple[Format, Datatype, str | None]]) -> list[str]:
    """Return a file stem for each output of one recipe, so that no two share a file.

    Parameters
    ----------
    stem : str
        The recipe's own.
    wanted : iterable of (Format, Datatype, str or None)
        In the order of the recipe; a name that the recipe gives is kept as it is.

    Returns
    -------
    list of str
        The first file of a name keeps ``stem``; a later one that would collide becomes
        ``stem.LABEL``, LABEL the datatype's. What still collides is the caller's to refuse.

    Examples
    --------
    >>> from wavegen.files.raw import Raw
    >>> from wavegen.files.sigmf import Sigmf
    >>> pair, raw = Sigmf(), Raw()
    >>> two = pair.datatypes["ci16_le"], pair.datatypes["ci8"]
    >>> distinct_stems("run", [(pair, two[0], None), (pair, two[1], None), (raw, two[0], None)])
    ['run', 'run.ci8', 'run']
    """
    wanted = list(wanted)
    taken = {
        name.casefold()
        for form, datatype, own in wanted
        if own is not None
        for name in form.files(own, datatype)
    }
    stems = []
    for form, datatype, own in wanted:
        if own is not None:
            stems.append(own)
            continue
        chosen = stem
        if taken & {name.casefold() for name in form.files(stem, datatype)}:
            chosen = f"{stem}.{datatype.label}"
        taken |= {name.casefold() for name in form.files(chosen, datatype)}
        stems.append(chosen)
    return stems


def check_facts(form: Format, facts: FileFacts, where: str) -> None:
    """Refuse what no format can hold, and datatypes that ``form`` does not write.

    Raises
    ------
    FileError
        At ``where``.
    """
    if facts.datatype.container not in form.datatypes.values():
        pick_datatype(form, facts.datatype.name, where)
    if facts.n_samples < 1 or facts.sample_rate_hz <= 0:
        raise FileError(
            where=where,
            problem=f"{facts.n_samples} samples at {format_hz(facts.sample_rate_hz)}",
            allowed="at least one sample, at a rate above 0 Hz",
            remedy="Correct the duration or the sample rate.",
        )
    if not 1 <= facts.n_channels <= 2:
        raise FileError(
            where=where,
            problem=f"{facts.n_channels} channels",
            allowed="1, or 2 coherent ones",
            remedy="Write further channels to files of their own.",
        )
    for item in facts.annotations:
        end = item.start_sample + (item.n_samples or 0)
        if not 0 <= item.start_sample < facts.n_samples or end > facts.n_samples:
            raise FileError(
                where=where,
                problem=f"the marker {item.label!r} covers {item.start_sample} to {end - 1}",
                allowed=f"samples 0 to {facts.n_samples - 1}",
                remedy="Cut markers at the end of the file.",
            )
        if (item.low_hz is None) != (item.high_hz is None):
            raise FileError(
                where=where,
                problem=f"the marker {item.label!r} has one band edge",
                allowed="both edges or neither",
                remedy="Give the other edge too.",
            )


def refuse_real_pair(facts: FileFacts, where: str) -> None:
    """Refuse two real channels, for formats where two columns are I and Q of one.

    Raises
    ------
    FileError
        At ``where``.
    """
    if facts.datatype.is_real and facts.n_channels > 1:
        raise FileError(
            where=where,
            problem="two real channels would read as I and Q of one",
            allowed="one real channel, or complex ones",
            remedy="Write sigmf or raw instead, or one file a channel.",
        )


def told_rate(
    path: Path, *, stated_hz: Fraction | None, hints: ReadHints
) -> tuple[Fraction, tuple[str, ...]]:
    """Return the sample rate that holds, and a warning where the user overrules the file.

    Raises
    ------
    FileError
        Neither the file nor the user gives one.
    """
    asked = hints.sample_rate_hz
    if asked is None:
        if stated_hz is None:
            raise FileError(
                where=str(path),
                problem="does not give the sample rate",
                allowed="samples together with their rate",
                remedy="Add --sample-rate, such as --sample-rate 20MHz.",
            )
        return stated_hz, ()
    if stated_hz is None or stated_hz == asked:
        return asked, ()
    text = (
        f"{path.name} states {format_hz(stated_hz)}; "
        f"read at {format_hz(asked)}, as --sample-rate says"
    )
    return asked, (text,)


def refuse_other_datatype(path: Path, stated: Datatype, hints: ReadHints) -> None:
    """Refuse a datatype hint that contradicts the file's header.

    Raises
    ------
    FileError
        The two differ.
    """
    if hints.datatype not in {None, stated.name}:
        raise FileError(
            where=str(path),
            problem=f"its header says {stated.name}, the option says {hints.datatype}",
            allowed="the header's datatype",
            remedy="Leave the datatype out, or read the data file as raw with --format.",
        )
