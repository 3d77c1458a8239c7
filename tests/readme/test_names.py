"""The README's table of names is what the registries hold; run as a script, it writes it."""

from pathlib import Path

from wavegen.dsp.pulses import PULSES
from wavegen.files import FORMATS
from wavegen.files.datatypes import DATATYPES
from wavegen.sources import SOURCES
from wavegen.sources.data import DATA
from wavegen.sources.mapping import MAPPINGS
from wavegen.stages import COMBINERS, STAGES

README = Path(__file__).resolve().parents[2] / "README.md"
BEGIN, END = "<!-- names: begin -->\n", "<!-- names: end -->\n"
SHELVES = {"crest": "lower crests", "channel": "channel", "device": "devices"}


def shelf(name):
    return STAGES[name].split(".")[2]


def table():
    """Return the table as Markdown."""
    rows = {"sources": [*SOURCES, *COMBINERS], "constellations": MAPPINGS, "pulses": PULSES}
    rows["data"] = DATA
    for place in dict.fromkeys(map(shelf, STAGES)):
        rows[f"stages: {SHELVES.get(place, f'{place}s')}"] = [
            n for n in STAGES if shelf(n) == place
        ]
    rows["file formats"] = FORMATS
    rows["datatypes"] = DATATYPES
    lines = [
        f"| {what} | {', '.join(f'`{name}`' for name in names)} |" for what, names in rows.items()
    ]
    return "\n".join(["| what | names |", "|---|---|", *lines]) + "\n"


def parts():
    text = README.read_text(encoding="utf-8")
    before, _, rest = text.partition(BEGIN)
    _, _, after = rest.partition(END)
    return before, rest.partition(END)[0], after


def test_the_table_is_what_the_registries_hold():
    assert parts()[1] == table(), "run: python tests/readme/test_names.py"


def test_every_registry_that_a_recipe_names_is_in_it():
    for registry in (SOURCES, COMBINERS, MAPPINGS, PULSES, DATA, STAGES, FORMATS):
        for name in registry:
            assert f"`{name}`" in table()


if __name__ == "__main__":
    before, _, after = parts()
    README.write_text(before + BEGIN + table() + END + after, encoding="utf-8")
