"""The metadata of a SigMF pair: to text, and back from text that may hold anything."""

from __future__ import annotations

import re
import warnings
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.errors import FileError
from wavegen.files.atomic import check_name
from wavegen.files.datatypes import (
    ALIGNMENTS,
    CF32_LE,
    CF64_LE,
    CI8,
    CI16_BE,
    CI16_LE,
    CI32_LE,
    CU8,
    RF32_LE,
    RF64_LE,
    RI8,
    RI16_BE,
    RI16_LE,
    RI32_LE,
    WORD_BITS,
    Datatype,
    takes_words,
)
from wavegen.files.faults import told
from wavegen.files.format import Annotation, FileFacts
from wavegen.files.strict_json import read_json

_COMPLEX = (CI16_LE, CI16_BE, CI8, CF32_LE, CF64_LE, CI32_LE, CU8)
_REAL = (RI16_LE, RI16_BE, RI8, RF32_LE, RF64_LE, RI32_LE)
_READ = {item.name: item for item in (*_COMPLEX, *_REAL)}
_GRAMMAR = re.compile(r"[rc](?:(?:f32|f64|i32|i16|u32|u16)_(?:le|be)|i8|u8)")
"""``core:datatype`` by the ABNF of SigMF 1.2.5; the schema's pattern does not end."""

_VERSION = re.compile(r"([0-9]+)\.[0-9]+\.[0-9]+")
_EXACT = re.compile(r"([0-9]{1,40})/([0-9]{1,40})")
_MOST_CHANNELS = 64
"""Channels of one recording that are read, one at a time."""

_EXTENSION = {"name": "wavegen", "version": "1.0.0", "optional": True}
"""Defined in ``schemas/wavegen.sigmf-ext.md``."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Metadata:
    """What the metadata say, checked.

    Parameters
    ----------
    datatype : Datatype
        How samples are coded.
    sample_rate_hz : Fraction or None
        Rate, Hz, if given.
    dataset : str or None
        Name of a data file that is not named after the metadata.
    title, description : str
        What it is.
    centre_frequency_hz : float or None
        Of the first segment, Hz.
    annotations : tuple of Annotation
        With starts counted from the first sample of the data file.
    capture_starts : tuple of int
        First samples of the segments, counted likewise.
    sha512 : str or None
        Stated digest of the data file.
    statistics : mapping or None
        Ours, if we wrote it.
    warnings : tuple of str
        Legal but doubtful.
    n_channels : int
        Channels interleaved sample by sample.
    word_bits, word_align : int, str or None
        Bits of the words in 16-bit containers and where they stand, if we wrote it.
    """

    datatype: Datatype
    sample_rate_hz: Fraction | None
    dataset: str | None
    title: str
    description: str
    centre_frequency_hz: float | None
    annotations: tuple[Annotation, ...]
    capture_starts: tuple[int, ...]
    sha512: str | None
    statistics: Mapping[str, object] | None
    warnings: tuple[str, ...]
    n_channels: int = 1
    word_bits: int | None = None
    word_align: str | None = None


def meta_text(facts: FileFacts, *, sha512: str, statistics: Mapping[str, object] | None) -> str:
    """Return the text of a metadata file.

    Parameters
    ----------
    facts : FileFacts
        What was written.
    sha512 : str
        Of the data file, hex.
    statistics : mapping or None
        Measured on the codes; finite JSON values.

    Raises
    ------
    FileError
        The result is not valid SigMF.
    """
    import sigmf

    rate = facts.sample_rate_hz
    nearest = float(rate)
    core = {
        "core:datatype": facts.datatype.name,
        "core:sample_rate": int(rate) if rate.denominator == 1 else nearest,
        "core:sha512": sha512,
        "core:num_channels": facts.n_channels if facts.n_channels > 1 else 0,
        "core:recorder": facts.generator,
        "core:description": facts.description or facts.title,
    }
    ours: dict[str, Any] = {
        "wavegen:title": facts.title,
        "wavegen:sample_rate_exact": "" if Fraction(repr(nearest)) == rate else _ratio(rate),
        "wavegen:word_bits": facts.datatype.n_bits if facts.datatype.is_padded else 0,
        "wavegen:word_align": facts.datatype.align,
        "wavegen:recipe_sha512": facts.recipe_sha512,
        "wavegen:statistics": dict(statistics or {}),
        "wavegen:facts": dict(facts.extra),
    }
    fields = {key: value for key, value in (core | ours).items() if value}
    if any(key.startswith("wavegen:") for key in fields):
        fields["core:extensions"] = [_EXTENSION]
    file = sigmf.SigMFFile(global_info=fields)
    capture = {}
    if facts.centre_frequency_hz is not None:
        capture["core:frequency"] = facts.centre_frequency_hz
    file.add_capture(0, metadata=capture)
    for item in facts.annotations:
        file.add_annotation(item.start_sample, item.n_samples, metadata=_annotation_fields(item))
    _validate(file, Path("the new metadata"))
    return str(file.dumps()) + "\n"


def _ratio(rate: Fraction) -> str:
    return f"{rate.numerator}/{rate.denominator}"


def _annotation_fields(item: Annotation) -> dict[str, object]:
    fields = {
        "core:label": item.label or None,
        "core:comment": item.comment or None,
        "core:freq_lower_edge": item.low_hz,
        "core:freq_upper_edge": item.high_hz,
    }
    return {key: value for key, value in fields.items() if value is not None}


def read_meta(path: Path) -> Metadata:
    """Return what a metadata file says.

    Parameters
    ----------
    path : Path
        The ``.sigmf-meta`` file.

    Raises
    ------
    FileError
        Missing or damaged, not valid SigMF, or a recording of a kind that is not read.
    """
    _refuse_missing(path)
    return parsed_meta(path, read_json(path))


def parsed_meta(path: Path, found: Mapping[str, Any]) -> Metadata:
    """Return what the JSON object of a metadata file says.

    Parameters
    ----------
    path : Path
        Where it comes from, for messages.
    found : mapping
        From :mod:`wavegen.files.strict_json`.

    Raises
    ------
    FileError
        Not valid SigMF, or a recording of a kind that is not read.
    """
    import sigmf

    fields = found.get("global")
    if not isinstance(fields, dict):
        raise _fault(path, f"'global' is {_shown(fields)}", "a JSON object")
    datatype = _datatype(path, fields.get("core:datatype"))
    doubts = _version_doubts(path, fields.get("core:version"))
    _check_numbers(path, fields)
    _refuse_kinds(path, fields)
    _validate(sigmf.SigMFFile(metadata=found), path)
    doubts += _extension_doubts(path, found, fields.get("core:extensions", []))
    captures: Any = found["captures"]
    annotations: Any = found["annotations"]
    offset = int(fields.get("core:offset", 0))  # the schema takes 5.0 for an integer
    if any(item.get("core:header_bytes") for item in captures):
        raise _fault(path, "core:header_bytes is not 0", "data files with nothing but samples")
    return Metadata(
        datatype=datatype,
        sample_rate_hz=_sample_rate(fields),
        dataset=_dataset(path, fields.get("core:dataset")),
        title=_text(fields.get("wavegen:title")),
        description=_text(fields.get("core:description")),
        centre_frequency_hz=captures[0].get("core:frequency") if captures else None,
        annotations=tuple(_annotation(item, offset) for item in annotations),
        capture_starts=tuple(int(item["core:sample_start"]) - offset for item in captures),
        sha512=fields.get("core:sha512"),
        statistics=_mapping(fields.get("wavegen:statistics")),
        warnings=doubts + _capture_doubts(path, captures),
        n_channels=int(fields.get("core:num_channels", 1)),
        **_word(fields),
    )


def _word(fields: Mapping[str, Any]) -> dict[str, Any]:
    """Return the word that our extension states, if it makes sense with the datatype."""
    bits, align = fields.get("wavegen:word_bits"), fields.get("wavegen:word_align")
    is_known = bits in WORD_BITS and align in ALIGNMENTS and isinstance(bits, int)
    if is_known and takes_words(_READ[fields["core:datatype"]]):
        return {"word_bits": bits, "word_align": align}
    return {}


def _refuse_missing(path: Path) -> None:
    with told(path):
        is_missing = not path.exists() and path.parent.is_dir() and not path.is_symlink()
    if is_missing:
        raise FileError(
            where=str(path),
            problem="there is no such file",
            allowed="both files of a SigMF pair in one folder",
            remedy="Copy it too, or read the data as raw: --format ci16_le --sample-rate 20MHz.",
        )


def _fault(path: Path, problem: str, allowed: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=allowed,
        remedy="Correct the metadata, or read the data file as raw with --format.",
    )


def _shown(value: object) -> str:
    """Return a value as a message shows it: short, whatever a stranger put there."""
    if value is None:
        return "missing"
    text = repr(value) if isinstance(value, str | int | float) else f"a {type(value).__name__}"
    return text if len(text) <= 60 else text[:57] + "..."


def _datatype(path: Path, name: object) -> Datatype:
    problem = f"core:datatype is {_shown(name)}"
    if not isinstance(name, str) or not _GRAMMAR.fullmatch(name):
        raise _fault(path, problem, "a SigMF datatype, such as ci16_le or cf32_le")
    if name not in _READ:
        raise _fault(path, problem, ", ".join(_READ))
    return _READ[name]


def _version_doubts(path: Path, version: object) -> tuple[str, ...]:
    found = _VERSION.fullmatch(version) if isinstance(version, str) else None
    if found is None or int(found[1]) > 1:
        raise _fault(path, f"core:version is {_shown(version)}", "SigMF 1.x.y")
    if int(found[1]) == 1:
        return ()
    return (f"{path.name} is of SigMF {version}, before 1.0; read as 1.x",)


def _check_numbers(path: Path, fields: Mapping[str, Any]) -> None:
    rate = fields.get("core:sample_rate", 1)
    is_number = isinstance(rate, int | float) and not isinstance(rate, bool)
    if not (is_number and 0 < rate <= 10**12):
        problem = f"core:sample_rate is {_shown(rate)}"
        raise _fault(path, problem, "a number above 0 and up to 1e12, in Hz")
    digest = fields.get("core:sha512")
    if digest is not None and not (
        isinstance(digest, str) and re.fullmatch("[0-9a-fA-F]{128}", digest)
    ):
        raise _fault(path, f"core:sha512 is {_shown(digest)}", "128 hexadecimal digits")


def _refuse_kinds(path: Path, fields: Mapping[str, Any]) -> None:
    count = fields.get("core:num_channels", 1)
    is_count = isinstance(count, int | float) and not isinstance(count, bool)
    if not (is_count and count in range(1, _MOST_CHANNELS + 1)):
        problem = f"core:num_channels is {_shown(count)}"
        raise _fault(path, problem, f"1 to {_MOST_CHANNELS} channels")
    if fields.get("core:metadata_only"):
        raise _fault(path, "core:metadata_only is set", "recordings with their data")
    if fields.get("core:trailing_bytes"):
        raise _fault(path, "core:trailing_bytes is not 0", "data files with nothing but samples")


def _validate(file: Any, path: Path) -> None:
    """Let the library check the metadata against the schema of the specification."""
    from jsonschema.exceptions import ValidationError

    with warnings.catch_warnings():
        # undeclared extensions: told by this module, in its own words
        warnings.simplefilter("ignore", DeprecationWarning)
        try:
            file.validate()
        except ValidationError as error:
            place = ".".join(str(step) for step in error.absolute_path) or "the top level"
            message = error.message if len(error.message) <= 200 else error.message[:197] + "..."
            problem = f"{place}: {message}"
            raise _fault(path, problem, "metadata by the SigMF specification") from error


def _extension_doubts(
    path: Path, found: Mapping[str, Any], extensions: list[dict[str, Any]]
) -> tuple[str, ...]:
    for item in extensions:
        if not item["optional"] and item["name"].partition(":")[0] != "wavegen":
            problem = f"needs the extension {_shown(item['name'])}"
            raise _fault(path, problem, "recordings whose extensions are optional")
    declared = {item["name"].partition(":")[0] for item in extensions} | {"core"}
    objects = [found["global"], *found["captures"], *found["annotations"]]
    used = {key.partition(":")[0] for item in objects for key in item if ":" in key}
    undeclared = ", ".join(sorted(used - declared))
    return (f"{path.name} uses undeclared extensions: {undeclared[:200]}",) if undeclared else ()


def _capture_doubts(path: Path, captures: list[dict[str, Any]]) -> tuple[str, ...]:
    if len(captures) < 2:
        return ()
    text = f"{path.name} has {len(captures)} segments; the signal may jump where they meet"
    if len({item.get("core:frequency") for item in captures}) > 1:
        text += ", and their centre frequencies differ"
    return (text,)


def _sample_rate(fields: Mapping[str, Any]) -> Fraction | None:
    """Return the exact rate: the decimal number as written, or our ratio if it is closest."""
    stated = fields.get("core:sample_rate")
    if stated is None:
        return None
    exact = _EXACT.fullmatch(_text(fields.get("wavegen:sample_rate_exact")))
    if exact and int(exact[2]):
        ratio = Fraction(int(exact[1]), int(exact[2]))
        if ratio < 2 * 10**12 and float(ratio) == float(stated):
            return ratio
    return Fraction(repr(stated))


def _dataset(path: Path, name: str | None) -> str | None:
    return None if name is None else check_name(name, where=f"{path}: core:dataset")


def _text(value: object) -> str:
    return value if isinstance(value, str) else ""


def _mapping(value: object) -> Mapping[str, object] | None:
    return value if isinstance(value, dict) else None


def _annotation(item: Mapping[str, Any], offset: int) -> Annotation:
    count = item.get("core:sample_count")
    return Annotation(
        start_sample=int(item["core:sample_start"]) - offset,
        n_samples=None if count is None else int(count),
        label=item.get("core:label", ""),
        comment=item.get("core:comment", ""),
        low_hz=item.get("core:freq_lower_edge"),
        high_hz=item.get("core:freq_upper_edge"),
    )
