"""What may be imported from outside, where, and what it costs to start."""

import ast
import fnmatch
import subprocess
import sys

import pytest

ALLOWED = {
    "numpy": ("*",),
    "scipy.fft": ("*",),
    "scipy.special": ("*",),
    "scipy.optimize": ("*",),
    "scipy.io": ("*",),
    "annotated_types": ("*",),
    "numba": ("wavegen.dsp.*",),
    "pydantic": ("wavegen.recipe.*",),
    "ruamel.yaml": ("wavegen.recipe.*",),
    "soundfile": ("wavegen.files.wav", "wavegen.files.riff"),
    "sigmf": ("wavegen.files.sigmf", "wavegen.files.sigmf_meta"),
    "jsonschema": ("wavegen.files.sigmf_meta", "wavegen.production.*"),
    "argcomplete": ("wavegen.cli.completion",),
    "matplotlib": ("wavegen.reports.*",),
    "jinja2": ("wavegen.reports.*",),
    "markupsafe": ("wavegen.reports.*",),
}
"""Library -> modules that may import it; everything else comes from Python itself."""

INSIDE_FUNCTIONS_ONLY = {"matplotlib", "jinja2", "markupsafe", "jsonschema", "numba", "soundfile"}
"""What is dear to load, or an extra, or needs a system library: loaded when it is needed."""

LIGHT = ("wavegen", "wavegen.core.errors", "wavegen.core.registry", "wavegen.core.progress")
"""Modules that, with all of ``cli`` and every table, load no numpy."""

HEAVY = ("numpy", "scipy", "pydantic", "matplotlib", "ruamel", "numba", "soundfile", "sigmf")


def library_of(target, names):
    """Return the keys of ALLOWED that an import touches."""
    package = target.split(".")[0]
    if package in sys.stdlib_module_names or package == "wavegen":
        return set()
    if package == "scipy":
        parts = target.split(".")
        return {f"scipy.{name}" for name in ((parts[1],) if len(parts) > 1 else names or ("",))}
    if package == "ruamel":
        return {"ruamel.yaml"}
    return {package}


def complaints(module):
    for item in module.imports:
        for library in library_of(item.target, item.names):
            where = f"{module.name}:{item.line} imports {library}"
            if not any(fnmatch.fnmatch(module.name, kind) for kind in ALLOWED.get(library, ())):
                yield where
            elif library in INSIDE_FUNCTIONS_ONLY and not item.is_inside_function:
                yield f"{where} at its top"


def is_light(module):
    is_table = module.path.name == "__init__.py"
    return module.name in LIGHT or module.room == "cli" or is_table


def test_outside_libraries_only_where_they_belong(house):
    assert [text for module in house.modules for text in complaints(module)] == []


def test_every_library_of_the_table_is_a_dependency(house):
    text = (house.root / "pyproject.toml").read_text(encoding="utf-8")
    for library in ALLOWED:
        name = library.split(".")[0].replace("_", "-")
        name = {"ruamel": "ruamel.yaml"}.get(name, name)
        used = any(
            library in library_of(item.target, item.names)
            for module in house.modules
            for item in module.imports
        )
        assert not used or f'"{name}>=' in text, name


def test_light_modules_name_no_heavy_library_at_their_top(house):
    for module in filter(is_light, house.modules):
        for item in module.imports:
            if not item.is_inside_function:
                assert item.target.split(".")[0] not in HEAVY, f"{module.name}:{item.line}"


def test_a_fresh_process_stays_light(house):
    """One process for all: whatever any of them drags in shows, by the first that does."""
    names = [module.name for module in filter(is_light, house.modules)]
    assert "wavegen" in names
    code = (
        "import importlib, sys\n"
        f"for name in {names!r}:\n"
        "    importlib.import_module(name)\n"
        f"    heavy = sorted(set({HEAVY!r}) & set(sys.modules))\n"
        "    if heavy:\n"
        "        sys.exit(f'{name} loads {heavy}')\n"
    )
    run = subprocess.run(
        [sys.executable, "-c", code], cwd=house.root, capture_output=True, text=True, check=False
    )
    assert run.returncode == 0, run.stderr


@pytest.mark.parametrize(
    ("name", "line", "is_refused"),
    [
        ("wavegen.core.new", "import numpy as np", False),
        ("wavegen.core.new", "import scipy.signal", True),
        ("wavegen.core.new", "from scipy import stats", True),
        ("wavegen.core.new", "from scipy import special", False),
        ("wavegen.core.new", "import scipy", True),
        ("wavegen.dsp.new", "def f():\n    import numba", False),
        ("wavegen.dsp.new", "import numba", True),
        ("wavegen.meters.new", "def f():\n    import numba", True),
        ("wavegen.sources.new", "import pydantic", True),
        ("wavegen.recipe.new", "from ruamel.yaml import YAML", False),
        ("wavegen.reports.new", "import matplotlib.pyplot", True),
        ("wavegen.reports.new", "def f():\n    import matplotlib.pyplot", False),
        ("wavegen.core.new", "import pandas", True),
        ("wavegen.core.new", "import os.path", False),
    ],
)
def test_the_law_itself(house, name, line, is_refused):
    like = house.modules[0]
    path = house.package / name.split(".")[1] / "new.py"
    module = type(like)(name, path, ast.parse(line))
    assert bool(list(complaints(module))) == is_refused
