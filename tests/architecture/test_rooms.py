"""Who may import whom: a room imports only what stands left of it."""

import ast

import pytest

ORDER = (
    ("core",),
    ("dsp",),
    ("laws", "files"),
    ("sources", "stages"),
    ("meters",),
    ("recipe",),
    ("production",),
    ("comparison", "tuning"),
    ("reports",),
    ("cli",),
)
"""Left to right; rooms that stand together do not import each other."""

RANK = {room: rank for rank, rooms in enumerate(ORDER) for room in rooms}


def room_of(target):
    parts = target.split(".")
    return parts[1] if parts[0] == "wavegen" and len(parts) > 1 else None


def complaints(module):
    if not module.room:  # the Python interface stands right of all rooms
        return
    for item in module.imports:
        where = f"{module.path.name}:{item.line} imports {item.target}"
        if item.target == "wavegen":
            if item.names != ("__version__",):
                yield f"{where}: name the module, not the package"
            continue
        room = room_of(item.target)
        if room is None or room == module.room:
            continue
        if room not in RANK:
            yield f"{where}: {room} is no room"
        elif module.room and RANK[room] >= RANK[module.room]:
            yield f"{where}: {room} does not stand left of {module.room}"


def test_every_folder_is_a_room_of_the_order(house):
    folders = {path.name for path in house.package.iterdir() if path.is_dir()} - {"__pycache__"}
    assert folders - set(RANK) == set()


def test_imports_go_left_only(house):
    found = [text for module in house.modules for text in complaints(module)]
    assert found == []


def test_rooms_init_hold_a_docstring_and_tables_only(house):
    for module in house.modules:
        if module.path.name != "__init__.py" or not module.room:
            continue  # the package itself names its verbs, which load when they are asked for
        assert ast.get_docstring(module.tree), module.name
        for node in module.tree.body[1:]:
            is_table = isinstance(node, ast.Assign | ast.AnnAssign)
            is_import = isinstance(node, ast.ImportFrom) and node.module == "wavegen.core.registry"
            assert is_table or is_import, f"{module.name}:{node.lineno} holds more than a table"


@pytest.mark.parametrize(
    ("room", "line", "is_refused"),
    [
        ("dsp", "from wavegen.core.signal import Signal", False),
        ("core", "import wavegen.dsp.windows", True),
        ("core", "def f():\n    from wavegen.files.raw import Raw", True),
        ("laws", "import wavegen.files.raw", True),
        ("stages", "import wavegen.sources.noise", True),
        ("sources", "import wavegen.stages.crest.clip", True),
        ("cli", "import wavegen.reports.tables", False),
        ("cli", "from wavegen import core", True),
        ("cli", "from wavegen import __version__", False),
        ("cli", "import wavegen.utils", True),
    ],
)
def test_the_law_itself(house, room, line, is_refused):
    like = house.modules[0]
    path = house.package / room / "new.py"
    module = type(like)(f"wavegen.{room}.new", path, ast.parse(line))
    assert bool(list(complaints(module))) == is_refused
