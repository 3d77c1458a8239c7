"""Recipes that are wrong in one way each: the fault stands where it is, and says what to do."""

from dataclasses import dataclass

import pytest

from wavegen.core.errors import RecipeFaults
from wavegen.recipe.load import load_text
from wavegen.recipe.tables import Tables

GOOD = "signal: {kind: carrier, symbol_rate: 1 MHz}\n"


@dataclass(frozen=True)
class Case:
    """A recipe, where its fault stands, and a word that the message must hold."""

    name: str
    text: str
    line: int
    column: int
    path: str
    word: str


def top(name: str, line: str, column: int, path: str, word: str) -> Case:
    """Add one line to a sound recipe of four lines."""
    head = "wavegen: 1\nsample_rate: 10 MHz\nduration: 1 ms\n" + GOOD
    return Case(name, head + line + "\n", 5, column, path, word)


def carrier(name: str, pair: str, column: int, path: str, word: str) -> Case:
    """Add one line to the mapping of a sound source; keys start in column 3."""
    head = "wavegen: 1\nsample_rate: 10 MHz\nduration: 1 ms\nsignal:\n  kind: carrier\n"
    text = f"{head}  symbol_rate: 1 MHz\n  {pair}\n"
    return Case(name, text, 7, column, path and f"signal.{path}", word)


def instead(  # noqa: PLR0917 # a row of the table below
    name: str, line: int, text: str, column: int, path: str, word: str
) -> Case:
    """Replace one of the four lines of a sound recipe."""
    lines = ["wavegen: 1", "sample_rate: 10 MHz", "duration: 1 ms", GOOD.strip()]
    lines[line - 1] = text
    return Case(name, "\n".join(lines) + "\n", line, column, path, word)


DEEP = "stages: " + "[" * 60 + "]" * 60
BENCH = "bench: {average_power_at_device: -10 dBm, path: "

CASES = [
    # the top level
    instead("other version", 1, "wavegen: 2", 10, "wavegen", "1"),
    instead("quoted version", 1, 'wavegen: "1"', 10, "wavegen", "quotes"),
    instead("version as truth", 1, "wavegen: true", 10, "wavegen", "1"),
    top("unknown key", "titel: x", 1, "titel", "title"),
    top("key by its field", "sample_rate_hz: 1", 1, "sample_rate_hz", "sample_rate"),
    top("key in capitals", "Seed: 3", 1, "Seed", "seed"),
    top("kind where no table is", "kind: carrier", 1, "kind", "unknown key"),
    top("far-off key", "quux: 3", 1, "quux", "output"),
    top("duplicate key", "duration: 2 ms", 1, "", "line 3"),
    top("merge key", "<<: {seed: 1}", 1, "", "merge"),
    top("tag", "seed: !!int 3", 7, "", "tag"),
    top("anchor unknown", "seed: *s", 7, "", "*s"),
    top("second document", "---\nwavegen: 1", 1, "", "document"),
    top("too deep", DEEP, 48, "", "levels"),
    top("unclosed quote", 'title: "x', 8, "", "YAML"),
    Case("nothing", "", 1, 1, "", "wavegen: 1"),
    Case("a list", "- wavegen: 1\n", 1, 1, "the recipe", "mapping"),
    Case("a word", "hello\n", 1, 1, "the recipe", "mapping"),
    # numbers
    top("seed below", "seed: -1", 7, "seed", "at least 0"),
    top("seed above", "seed: 9223372036854775808", 7, "seed", "9223372036854775807"),
    top("seed broken", "seed: 1.5", 7, "seed", "whole"),
    top("seed octal", "seed: 0o17", 7, "seed", "octal"),
    top("seed leading zero", "seed: 010", 7, "seed", "octal"),
    top("seed hexadecimal", "seed: 0x1F", 7, "seed", "decimal"),
    top("seed by the clock", "seed: 1:30", 7, "seed", "time of day"),
    top("seed grouped", "seed: 1_000", 7, "seed", "ungrouped"),
    top("seed as truth", "seed: true", 7, "seed", "not a number"),
    top("seed quoted", 'seed: "3"', 7, "seed", "quotes"),
    top("seed empty", "seed:", 1, "seed", "no value"),
    top("seed infinite", "seed: .inf", 7, "seed", "finite"),
    top("seed not a number", "seed: .nan", 7, "seed", "finite"),
    top("seed huge", "seed: " + "9" * 5000, 7, "seed", "characters"),
    top("seed as a list", "seed: [1]", 7, "seed", "list"),
    instead("no unit", 2, "sample_rate: 10000000", 14, "sample_rate", "10000000 Hz"),
    instead("milli for mega", 2, "sample_rate: 10 mHz", 14, "sample_rate", "MHz"),
    instead("another dimension", 2, "sample_rate: 10 ms", 14, "sample_rate", "Hz"),
    instead("zero rate", 2, "sample_rate: 0 Hz", 14, "sample_rate", "above 0 Hz"),
    instead("negative rate", 2, "sample_rate: -1 MHz", 14, "sample_rate", "above 0"),
    instead("infinite rate", 2, "sample_rate: .inf Hz", 14, "sample_rate", "number"),
    instead("division by zero", 2, "sample_rate: 1/0 Hz", 14, "sample_rate", "zero"),
    instead("huge exponent", 2, "sample_rate: 1e999 Hz", 14, "sample_rate", "number"),
    instead("decimal comma", 2, "sample_rate: 1,5 MHz", 14, "sample_rate", "number"),
    carrier("unit where none is", "roll: 1", 3, "roll", "keys"),
    carrier("ratio with unit", "ratio: 2 dB", 10, "ratio", "unit"),
    carrier("fraction with percent", "prefix: 5 %", 11, "prefix", "144/2048"),
    carrier("interval", "weight: 10.5", 11, "weight", "at most 10"),
    carrier("bare point", "weight: .5", 11, "weight", "0 before"),
    carrier("number in a tuple", "delays: [1 us, 2]", 18, "delays[1]", "2 s"),
    carrier("one for a list", "delays: 1 us", 11, "delays", "brackets"),
    carrier("wrong count", "corner: [1, 2, 3]", 11, "corner", "list of 2"),
    # durations
    instead("bare duration", 3, "duration: 10", 11, "duration", "unit"),
    instead("milli in capitals", 3, "duration: 10 MS", 11, "duration", "ms"),
    instead("no time", 3, "duration: 0 ms", 11, "duration", "above zero"),
    instead("part of a symbol", 3, "duration: 1.5 symbols", 11, "duration", "whole"),
    instead("duration list", 3, "duration: [1 ms]", 11, "duration", "duration"),
    instead("duration key", 3, "duration: {at: 1 ms, min: 2 ms}", 27, "duration.min", "at"),
    instead("duration without at", 3, "duration: {least: 1 ms}", 11, "duration.at", "at"),
    instead(
        "duration backwards", 3, "duration: {at: 9 ms, most: 2 ms}", 28, "duration.most", "9 ms"
    ),
    instead(
        "duration multiple", 3, "duration: {at: 9 ms, multiple: 3}", 32, "duration.multiple", "unit"
    ),
    # text
    top("title a number", "title: 12", 8, "title", "quotes"),
    top("title a truth", "title: true", 8, "title", "quotes"),
    top("title a list", "title: [x]", 8, "title", "text"),
    top("title of two lines", 'title: "a\\nb"', 8, "title", "line end"),
    top("title with a control", 'title: "a\\u001b[2J"', 8, "title", "U+001B"),
    top("title with half a pair", 'title: "a\\ud800"', 8, "title", "U+D800"),
    top("title turning", 'title: "a\\u202eb"', 8, "title", "U+202E"),
    top("title of two lines", 'title: "a\\nb"', 8, "title", "line end"),
    carrier("truth in old words", "is_offset: no", 14, "is_offset", "Write false"),
    carrier("truth as number", "is_offset: 1", 14, "is_offset", "true or false"),
    carrier("choice", "mode: evn", 9, "mode", "even"),
    carrier("null where none is", "level: null", 10, "level", "-3 dB"),
    carrier("notation", "used: 1-6", 9, "used", "1..6"),
    carrier("control in a notation", 'used: "1..\\u00006"', 9, "used", "U+0000"),
    carrier("not a number in a notation", "used: [.nan]", 9, "used", "finite"),
    # members of tables
    instead("no kind", 4, "signal: {symbol_rate: 1 MHz}", 9, "signal.kind", "carrier"),
    instead("empty kind", 4, "signal: {kind: , symbol_rate: 1 MHz}", 10, "signal.kind", "carrier"),
    instead("unknown kind", 4, "signal: {kind: carier}", 16, "signal.kind", "Did you mean carrier"),
    instead("kind of another table", 4, "signal: {kind: ceiling}", 16, "signal.kind", "several"),
    instead("kind as a list", 4, "signal: {kind: [carrier]}", 16, "signal.kind", "name"),
    instead("signal a list", 4, "signal: [carrier]", 9, "signal", "mapping"),
    instead("signal empty", 4, "signal:", 1, "signal", "carrier"),
    instead("bare name lacks keys", 4, "signal: carrier", 9, "signal.symbol_rate", "3.84 MHz"),
    carrier("pulse misspelt", "pulse: rond", 10, "pulse", "round"),
    carrier("pulse key", "pulse: {kind: round, rolloff: 0.3}", 24, "pulse.rolloff", "roll_off"),
    carrier("pulse bound", "pulse: {kind: round, roll_off: 1.2}", 34, "pulse.roll_off", "most 1"),
    carrier("pulse kind", "pulse: {roll_off: 0.2}", 10, "pulse.kind", "square"),
    carrier("data key", "data: {first: 3}", 10, "data.first", "share"),
    carrier("shared name", 'data: {share: ".."}', 17, "data.share", "dots"),
    top("stage unknown", "stages: [{kind: ceilin}]", 17, "stages[0].kind", "ceiling"),
    top("stage no list", "stages: {kind: ceiling}", 9, "stages", "list"),
    top("stage bound", "stages: [{kind: ceiling, ceiling: 0 dB}]", 35, "stages[0].ceiling", "0 dB"),
    instead("no parts", 4, "signal: {kind: several, parts: []}", 32, "signal.parts", "at least 1"),
    instead(
        "part name",
        4,
        "signal: {kind: several, parts: [{name: ../x, signal: choosy}]}",
        40,
        "signal.parts[0].name",
        "separator",
    ),
    instead(
        "settings refuse each other", 4, "signal: {kind: choosy, low: 3}", 9, "signal.high", "Swap"
    ),
    instead(
        "settings refuse by path",
        4,
        "signal: {kind: choosy, how: recipe, high: -1}",
        43,
        "signal.high",
        "Swap",
    ),
    # bench
    top("path empty", BENCH + "[]}", 49, "bench.path", "at least 1"),
    top("no device", BENCH + "[{name: c}]}", 49, "bench.path", "role: device"),
    top(
        "two devices",
        BENCH + "[{name: c, role: device}, {name: d, role: device}]}",
        49,
        "bench.path",
        "driver",
    ),
    top("role", BENCH + "[{name: c, role: devise}]}", 66, "bench.path[0].role", "device"),
    top(
        "rating in dB",
        BENCH + "[{name: c, peak_limit: 3 dB}]}",
        72,
        "bench.path[0].peak_limit",
        "dBm",
    ),
    top("path without name", BENCH + "[{role: device}]}", 50, "bench.path[0].name", "name"),
    # output
    top("format", "output: {iq: [sgmf]}", 15, "output.iq[0]", "sigmf"),
    top("format key", "output: {iq: [{fmt: wav}]}", 21, "output.iq[0].fmt", "format"),
    top("format missing", "output: {iq: [{name: a}]}", 15, "output.iq[0].format", "format"),
    top(
        "datatype",
        "output: {iq: [{format: sound, datatype: float23}]}",
        41,
        "output.iq[0].datatype",
        "float32",
    ),
    top("one file twice", "output: {iq: [pairs, pairs]}", 22, "output.iq[1]", "name"),
    top(
        "file name",
        "output: {iq: [{format: pairs, name: ..}]}",
        37,
        "output.iq[0].name",
        "dots",
    ),
    top(
        "file name a number",
        "output: {iq: [{format: pairs, name: 3}]}",
        37,
        "output.iq[0].name",
        "quotes",
    ),
    top("no files", "output: {iq: []}", 14, "output.iq", "at least 1"),
    top("files no list", "output: {iq: sigmf}", 14, "output.iq", "brackets"),
    top("two levels", "output: {peak: -1 dBFS, average: -12 dBFS}", 34, "output.average", "one of"),
    top("peak above", "output: {peak: 1 dBFS}", 16, "output.peak", "at most 0 dBFS"),
    top("peak in dB", "output: {peak: -1 dB}", 16, "output.peak", "dBFS"),
]


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_one_fault_where_it_is(case: Case, tables: Tables) -> None:
    with pytest.raises(RecipeFaults) as caught:
        load_text(case.text, tables=tables)
    (fault,) = caught.value.faults
    place = f"recipe.yaml:{case.line}:{case.column}"
    assert fault.where == (f"{place}: {case.path}" if case.path else place)
    assert fault.problem
    assert fault.allowed
    assert fault.remedy
    assert case.word in f"{fault.problem} | {fault.allowed} | {fault.remedy}"
    assert "\n" not in str(fault)
    assert len(str(fault)) < 500


def test_the_recipe_that_the_cases_spoil_is_sound(tables: Tables) -> None:
    head = "wavegen: 1\nsample_rate: 10 MHz\nduration: 1 ms\n"
    assert load_text(head + GOOD, tables=tables).recipe.seed == 1


@pytest.mark.parametrize(
    ("text", "path", "example"),
    [
        ("sample_rate: 1 MHz\nduration: 1 ms\n" + GOOD, "wavegen", "1"),
        ("wavegen: 1\nduration: 1 ms\n" + GOOD, "sample_rate", "3.84 MHz"),
        ("wavegen: 1\nsample_rate: 1 MHz\n" + GOOD, "duration", "10 ms"),
        ("wavegen: 1\nsample_rate: 1 MHz\nduration: 1 ms\n", "signal", "{kind: carrier}"),
    ],
)
def test_required_keys_are_named(text: str, path: str, example: str, tables: Tables) -> None:
    with pytest.raises(RecipeFaults) as caught:
        load_text(text, tables=tables)
    (fault,) = caught.value.faults
    assert fault.where == f"recipe.yaml:1:1: {path}"
    assert fault.remedy == f"Add {path}: {example}"


def test_all_faults_come_at_once_in_the_order_of_the_file(tables: Tables) -> None:
    text = """\
sample_rate: 10
duration: 1 mS
seed: -3
titel: x
signal:
  kind: several
  parts:
    - signal: {kind: carrier, symbol_rate: 1, pulse: rond}
      name: a/b
    - signal: carrier
    - {signal: {kind: carrier, symbol_rate: 1 MHz, level: x}, level: 3}
seed: 4
output: {peak: 2 dBFS, iq: [sigmf, sgmf]}
"""
    with pytest.raises(RecipeFaults) as caught:
        load_text(text, tables=tables)
    assert [fault.where.removeprefix("recipe.yaml:") for fault in caught.value.faults] == [
        "1:1: wavegen",
        "1:14: sample_rate",
        "2:11: duration",
        "3:7: seed",
        "4:1: titel",
        "8:44: signal.parts[0].signal.symbol_rate",
        "8:54: signal.parts[0].signal.pulse",
        "9:13: signal.parts[0].name",
        "10:15: signal.parts[1].signal.symbol_rate",
        "11:59: signal.parts[2].signal.level",
        "11:70: signal.parts[2].level",
        "12:1",
        "13:16: output.peak",
        "13:36: output.iq[1]",
    ]
    assert len(str(caught.value).splitlines()) == 14
