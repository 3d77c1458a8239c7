"""One file, one line: members and tables agree, both ways."""

import ast
import importlib
from pathlib import Path

import pytest

from wavegen.core.registry import Registry

ROOT = Path(__file__).parents[2]


def tables():
    found = {}
    for path in sorted((ROOT / "wavegen").rglob("__init__.py")):
        name = ".".join(path.parent.relative_to(ROOT).parts)
        for attribute, value in vars(importlib.import_module(name)).items():
            if isinstance(value, Registry):
                found[attribute] = (name, value)
    return found


TABLES = tables()
LINES = [(table, kind) for table, (_, registry) in TABLES.items() for kind in registry]

MARKS = {
    "SOURCES": ("wavegen.sources", {"cycle", "build"}),
    "STAGES": ("wavegen.stages", {"build"}),
    "COMBINERS": ("wavegen.stages", {"combine"}),
    "PULSES": ("wavegen.dsp.pulses", {"design"}),
    "DATA": ("wavegen.sources.data", {"bind"}),
    "METERS": ("wavegen.meters", {"begin"}),
    "FORMATS": ("wavegen.files", {"detect", "read"}),
}
"""Table -> where its members live, and the verbs by which a class shows that it is one."""


def is_protocol(node):
    return any(isinstance(base, ast.Name) and base.id == "Protocol" for base in node.bases)


def classes_with(verbs, package):
    """Return ``module:Class`` of each public class under a package that has these methods."""
    for path in sorted(ROOT.joinpath(*package.split(".")).rglob("*.py")):
        module = ".".join(path.relative_to(ROOT).with_suffix("").parts)
        for node in ast.parse(path.read_text(encoding="utf-8")).body:
            if not isinstance(node, ast.ClassDef) or node.name.startswith("_"):
                continue
            methods = {item.name for item in node.body if isinstance(item, ast.FunctionDef)}
            if verbs <= methods and not is_protocol(node):
                yield f"{module}:{node.name}"


def test_the_tables_are_where_they_are_looked_for():
    known = set(MARKS) | {"MAPPINGS"}
    assert known <= set(TABLES)
    assert set(TABLES) - known == set(), "a new table needs its mark here"


@pytest.mark.parametrize(("table", "kind"), LINES)
def test_every_line_has_its_file_inside_its_own_room(table, kind):
    package, members = TABLES[table]
    module, _, attribute = members[kind].partition(":")
    assert module.startswith(f"{package}.")
    assert module.split(".")[1] == package.split(".")[1]
    assert callable(members.load(kind))
    assert members.load(kind).__module__ == module
    assert members.load(kind).__name__ == attribute


@pytest.mark.parametrize("kind", [kind for _, kind in LINES])
def test_names_are_lower_case_words(kind):
    assert kind == kind.lower()
    assert kind.replace("_", "").isalnum()


@pytest.mark.parametrize("table", MARKS)
def test_every_member_has_its_line(table):
    package, verbs = MARKS[table]
    lines = set(TABLES[table][1].values())
    assert set(classes_with(verbs, package)) == lines


def test_every_constellation_has_its_line():
    lines = set(TABLES["MAPPINGS"][1].values())
    folder = ROOT / "wavegen" / "sources" / "mapping"
    found = set()
    for path in folder.glob("*.py"):
        for node in ast.parse(path.read_text(encoding="utf-8")).body:
            if isinstance(node, ast.FunctionDef) and not node.name.startswith("_"):
                is_maker = isinstance(node.returns, ast.Name)
                if is_maker and node.returns.id == "Constellation" and not node.args.args:
                    found.add(f"wavegen.sources.mapping.{path.stem}:{node.name}")
    assert found == lines


@pytest.mark.parametrize("shelf", ["combine", "channel", "crest", "device", "converter"])
def test_every_file_on_a_shelf_of_stages_is_a_member(shelf):
    lines = [*TABLES["STAGES"][1].values(), *TABLES["COMBINERS"][1].values()]
    modules = {line.partition(":")[0] for line in lines}
    for path in (ROOT / "wavegen" / "stages" / shelf).glob("*.py"):
        if path.stem != "__init__":
            assert f"wavegen.stages.{shelf}.{path.stem}" in modules


@pytest.mark.parametrize("package", ["dsp/pulses", "sources/data"])
def test_every_file_of_a_small_room_is_a_member(package):
    name = f"wavegen.{package.replace('/', '.')}"
    lines = [line for _, registry in TABLES.values() for line in registry.values()]
    modules = {line.partition(":")[0] for line in lines}
    for path in (ROOT / "wavegen" / package).glob("*.py"):
        if path.stem != "__init__":
            assert f"{name}.{path.stem}" in modules
