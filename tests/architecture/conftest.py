"""The source tree as text, parsed once: nothing here imports what it judges."""

import ast
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from types import SimpleNamespace

import pytest

ROOT = Path(__file__).parents[2]
PACKAGE = ROOT / "wavegen"


@dataclass(frozen=True)
class Import:
    """One import of one module, wherever in the file it stands."""

    target: str
    line: int
    is_inside_function: bool
    names: tuple[str, ...]


@dataclass(frozen=True)
class Module:
    """One file of the package."""

    name: str
    path: Path
    tree: ast.Module

    @property
    def room(self):
        """The first folder, or an empty string for files beside the rooms."""
        parts = self.path.relative_to(PACKAGE).parts
        return parts[0] if len(parts) > 1 else ""

    @cached_property
    def imports(self):
        return tuple(_imports(self.tree, is_inside=False))


def _imports(node, *, is_inside):
    for child in ast.iter_child_nodes(node):
        if isinstance(child, ast.Import):
            for alias in child.names:
                yield Import(alias.name, child.lineno, is_inside, ())
        elif isinstance(child, ast.ImportFrom):
            assert child.level == 0, f"line {child.lineno}: relative import"
            names = tuple(alias.name for alias in child.names)
            yield Import(child.module, child.lineno, is_inside, names)
        else:
            is_function = isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda)
            is_never_run = isinstance(child, ast.If) and ast.unparse(child.test) == "TYPE_CHECKING"
            yield from _imports(child, is_inside=is_inside or is_function or is_never_run)


def read_module(path, name=None):
    parts = list(path.relative_to(ROOT).with_suffix("").parts) if name is None else [name]
    if parts[-1] == "__init__":
        parts.pop()
    return Module(".".join(parts), path, ast.parse(path.read_text(encoding="utf-8")))


@pytest.fixture(scope="session")
def house():
    modules = [read_module(path) for path in sorted(PACKAGE.rglob("*.py"))]
    assert len(modules) > 30
    return SimpleNamespace(root=ROOT, package=PACKAGE, modules=modules)
