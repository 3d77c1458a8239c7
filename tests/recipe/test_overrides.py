"""``--set`` changes one value before the recipe is checked, and is blamed for it."""

from fractions import Fraction

import pytest

from wavegen.core.errors import RecipeFaults
from wavegen.recipe.load import load_text
from wavegen.recipe.reader import read_tree
from wavegen.recipe.settings import Recipe
from wavegen.recipe.tables import Tables

TEXT = """\
wavegen: 1
sample_rate: 10 MHz
duration: 1 ms
signal:
  kind: several
  parts:
    - signal: &one {kind: carrier, symbol_rate: 1 MHz, pulse: round}
    - signal: *one
stages:
  - {kind: ceiling, ceiling: 7 dB}
"""


def load(tables: Tables, *overrides: str) -> Recipe:
    return load_text(TEXT, overrides=overrides, tables=tables).recipe


def test_values_are_set(tables: Tables) -> None:
    recipe = load(
        tables,
        "seed=3",
        "stages[0].ceiling=8.5 dB",
        "signal.parts[0].signal.symbol_rate = 1625/6 kHz",
        "signal.parts[0].signal.pulse={kind: round, roll_off: 0.5}",
        "output.peak=-3 dBFS",
        "title='a = b'",
    )
    assert recipe.seed == 3
    assert recipe.stages[0].ceiling_db == 8.5
    assert recipe.signal.parts[0].signal.symbol_rate_hz == Fraction(812500, 3)
    assert recipe.signal.parts[0].signal.pulse.roll_off == 0.5
    assert recipe.output.peak_dbfs == -3
    assert recipe.title == "a = b"


def test_an_alias_is_set_in_one_place_only(tables: Tables) -> None:
    recipe = load(tables, "signal.parts[1].signal.symbol_rate=2 MHz")
    rates = [part.signal.symbol_rate_hz for part in recipe.signal.parts]
    assert rates == [10**6, 2 * 10**6]


def test_the_later_one_wins_and_may_build_on_the_earlier(tables: Tables) -> None:
    recipe = load(tables, "stages[1]={kind: ceiling, ceiling: 3 dB}", "stages[1].ceiling=4 dB")
    assert [stage.ceiling_db for stage in recipe.stages] == [7, 4]
    assert load(tables, "seed=3", "seed=4").seed == 4


def test_an_empty_value_unsets_what_may_be_unset(tables: Tables) -> None:
    assert load(tables, "bench=").bench is None


def test_the_tree_given_is_left_alone(tables: Tables) -> None:
    before, _ = read_tree(TEXT)
    load(tables, "seed=3")
    assert read_tree(TEXT)[0] == before


@pytest.mark.parametrize(
    ("override", "where", "word"),
    [
        ("seed=-1", "--set seed", "at least 0"),
        ("sed=1", "--set sed", "seed"),
        ("seed", "--set seed", "path=value"),
        ("=3", "--set (nothing)", "path=value"),
        ("a b=3", "--set a b", "path=value"),
        ("signal.parts[0=3", "--set signal.parts[0", "path=value"),
        ("seed=[1", "--set seed", "bracket"),
        ("seed=1\n---\n2", "--set seed", "document"),
        ("seed=*x", "--set seed", "names nothing"),
        ("seed=!!int 1", "--set seed", "tag"),
        ("sample_rate=3", "--set sample_rate", "3 Hz"),
        ("sample_rate=3 mHz", "--set sample_rate", "MHz"),
        ("stages[0].ceilin=3 dB", "--set stages[0].ceilin", "ceiling"),
        ("stages[0].ceiling=0 dB", "--set stages[0].ceiling", "above 0 dB"),
        ("stages[2].ceiling=3 dB", "--set stages[2].ceiling", "stages[0]"),
        ("stages.ceiling=3 dB", "--set stages.ceiling", "stages[0]"),
        ("signal[0].kind=x", "--set signal[0].kind", "signal.kind"),
        ("signl.kind=x", "--set signl.kind: signl", "Did you mean signal?"),
        ("stages=[{kind: clip}]", "--set stages: stages[0].kind", "ceiling"),
        (
            "signal.parts[0].signal.pulse.roll_off=0.5",
            "--set signal.parts[0].signal.pulse.roll_off",
            "{kind: round, roll_off: ...}",
        ),
        (
            "signal.parts[0].signal.pulse={kind: round, roll_off: 2}",
            "--set signal.parts[0].signal.pulse: signal.parts[0].signal.pulse.roll_off",
            "at most 1",
        ),
        ("output={peak: 0 dBFS, peak: 0 dBFS}", "--set output", "twice"),
        ('title="a\\tb"', "--set title", "tab"),
    ],
)
def test_faults_name_the_override(override: str, where: str, word: str, tables: Tables) -> None:
    with pytest.raises(RecipeFaults) as caught:
        load(tables, override)
    (fault,) = caught.value.faults
    assert fault.where == where
    assert word in f"{fault.problem} | {fault.allowed} | {fault.remedy}"
    assert fault.allowed


def test_faults_of_the_file_come_first(tables: Tables) -> None:
    text = TEXT + "titel: x\n"
    with pytest.raises(RecipeFaults) as caught:
        load_text(text, overrides=["seed=-1", "sed=1"], tables=tables)
    wheres = [fault.where for fault in caught.value.faults]
    assert wheres == ["recipe.yaml:11:1: titel", "--set seed", "--set sed"]
