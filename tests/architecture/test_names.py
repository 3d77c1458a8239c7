"""Names that carry their units, modules that have their tests, files that name no machine."""

import ast
import dataclasses
import re
import typing
from fractions import Fraction
from pathlib import Path

import pytest

from wavegen.core.registry import Member
from wavegen.core.units import DIMENSIONS
from wavegen.dsp.pulses import PULSES
from wavegen.sources import SOURCES
from wavegen.sources.data import DATA
from wavegen.stages import COMBINERS, STAGES

ROOT = Path(__file__).parents[2]

DIMENSIONLESS = {
    *("roll_off", "taps", "multiple", "bt", "h"),
    *("smoothness", "am_am", "am_pm", "small_signal", "asymptote"),
}
"""Fields of settings that are numbers without a unit, by nature."""

COVERED_BY: dict[str, str] = {}
"""Modules without a mirror, and the suite that exercises them."""

BANNED_MODULES = {"utils", "util", "helpers", "helper", "misc", "common", "tools", "base"}

MACHINE_PATH = re.compile(
    r"(?<![\w.}])/(?:home|Users|root|tmp|work|mnt|opt|srv|media)/\w|\b[A-Z]:\\\\?(?:Users|Temp)\\"
)

TEXTS = {".py", ".md", ".toml", ".yaml", ".yml", ".json", ".txt", ".sh", ""}


def settings_classes():
    """Return every settings class of a table and every dataclass nested in one."""
    found = {}
    waiting = [
        registry.load(kind)
        for registry in (SOURCES, STAGES, COMBINERS, PULSES, DATA)
        for kind in registry
    ]
    while waiting:
        kind = waiting.pop()
        is_notation = hasattr(kind, "parse")  # a text or list of its own, not settings
        if dataclasses.is_dataclass(kind) and not is_notation and kind not in found:
            found[kind] = typing.get_type_hints(kind, include_extras=True)
            for hint in found[kind].values():
                waiting.extend(leaves(hint))
    return found


def leaves(hint):
    """Return the plain classes inside an annotation; a member of a table is none."""
    if typing.get_origin(hint) is typing.Annotated:
        inner, *marks = typing.get_args(hint)
        return [] if any(isinstance(mark, Member) for mark in marks) else leaves(inner)
    arguments = typing.get_args(hint)
    if arguments:
        return [leaf for argument in arguments for leaf in leaves(argument)]
    return [hint] if isinstance(hint, type) else []


SETTINGS = settings_classes()


@pytest.mark.parametrize("kind", SETTINGS, ids=lambda kind: kind.__name__)
class TestSettings:
    def test_are_frozen_with_slots_and_keywords_only(self, kind):
        parameters = kind.__dataclass_params__
        assert parameters.frozen
        assert "__slots__" in vars(kind)
        assert all(item.kw_only for item in dataclasses.fields(kind) if item.init)

    def test_physical_numbers_carry_their_unit(self, kind):
        for name, hint in SETTINGS[kind].items():
            if {float, Fraction, complex} & set(leaves(hint)):
                has_unit = any(name.endswith(suffix) for suffix in DIMENSIONS)
                assert has_unit or name in DIMENSIONLESS, f"{kind.__name__}.{name}"

    def test_every_field_is_described(self, kind):
        described = kind.__doc__ or ""
        for field in dataclasses.fields(kind):
            line = rf"^\s+(\w+, )*{field.name}(, \w+)* : "
            assert re.search(line, described, re.MULTILINE), field.name


def test_settings_files_import_their_annotations_at_run_time():
    for kind in SETTINGS:
        path = ROOT / (kind.__module__.replace(".", "/") + ".py")
        assert "TYPE_CHECKING" not in path.read_text(encoding="utf-8"), path.name


def modules():
    return [
        path.relative_to(ROOT)
        for path in sorted((ROOT / "wavegen").rglob("*.py"))
        if path.name != "__init__.py"
    ]


@pytest.mark.parametrize("path", modules(), ids=str)
def test_every_module_has_its_test(path):
    mirror = Path("tests").joinpath(*path.parts[1:-1], f"test_{path.name}")
    covering = COVERED_BY.get(path.as_posix())
    assert (ROOT / (covering or mirror)).is_file(), f"{mirror} is missing"


def test_exceptions_are_needed():
    for module, suite in COVERED_BY.items():
        assert (ROOT / module).is_file()
        assert (ROOT / suite).is_file()


@pytest.mark.parametrize("path", modules(), ids=str)
def test_modules_are_nouns_of_the_trade(path):
    assert path.stem not in BANNED_MODULES
    assert re.fullmatch(r"[a-z][a-z0-9_]*", path.stem)


@pytest.mark.parametrize("path", modules(), ids=str)
def test_the_library_is_quiet(path):
    if path.parts[1] == "cli":
        return
    for node in ast.walk(ast.parse((ROOT / path).read_text(encoding="utf-8"))):
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
            assert node.func.id not in {"print", "input"}, f"{path}:{node.lineno}"


def test_no_file_names_a_place_on_one_machine():
    found = []
    for top in ("wavegen", "tests", "recipes", ".ci"):
        for path in sorted((ROOT / top).rglob("*")):
            if path.suffix in TEXTS and path.is_file() and "__pycache__" not in path.parts:
                text = path.read_text(encoding="utf-8", errors="replace")
                found += [f"{path.relative_to(ROOT)}: {hit}" for hit in MACHINE_PATH.findall(text)]
    for path in sorted(ROOT.glob("*.*")):
        if path.suffix in TEXTS and path.is_file():
            found += MACHINE_PATH.findall(path.read_text(encoding="utf-8"))
    assert found == []


@pytest.mark.parametrize(
    ("parts", "is_refused"),
    [
        (("", "home", "someone", "x"), True),
        (("open('", "tmp", "x.iq')"), True),
        (("a", "tmp", "b"), False),
        (("", "etc", "passwd"), False),
        (("https:", "", "example.org", "home", "x"), False),
    ],
)
def test_the_pattern_itself(parts, is_refused):
    assert bool(MACHINE_PATH.search("/".join(parts))) == is_refused
