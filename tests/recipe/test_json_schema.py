"""The schema takes what the checker takes, and refuses most of what it refuses."""

import importlib.util
import re
import sys
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Self

import pytest
from annotated_types import Ge, Gt, Le, Lt
from jsonschema import Draft202012Validator

from wavegen.core.errors import RecipeError
from wavegen.core.registry import Registry
from wavegen.core.units import DIMENSIONS, QuantityError
from wavegen.recipe.dump import dump
from wavegen.recipe.find import shipped_recipes
from wavegen.recipe.json_schema import quantity_schema, recipe_schema
from wavegen.recipe.load import load_recipe, load_text
from wavegen.recipe.reader import read_tree
from wavegen.recipe.scalars import plain
from wavegen.recipe.tree import FaultError
from wavegen.stages import STAGES

HEAD = "wavegen: 1\nsample_rate: 10 MHz\nduration: 1 ms\n"
SHIPPED = {name: path for name, _, path in shipped_recipes()}


def neighbour(name, path):
    """Import a file of the tests by its path."""
    if name not in sys.modules:
        spec = importlib.util.spec_from_file_location(name, path)
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module
        spec.loader.exec_module(module)
    return sys.modules[name]


@pytest.fixture(autouse=True)
def formats():
    """Stand in for the fixture of this folder: the schema speaks of the real formats."""


@pytest.fixture(scope="module")
def real():
    return Draft202012Validator(recipe_schema())


def value(text):
    tree, faults = read_tree(text)
    assert not faults
    return plain(tree)


def is_valid(validator, text):
    return validator.is_valid(value(text))


def test_it_is_a_schema_and_says_of_which_draft(real):
    Draft202012Validator.check_schema(real.schema)
    assert real.schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"


def test_every_reference_leads_somewhere(real):
    found = set(re.findall(r"'\$ref': '#/\$defs/([^']+)'", str(real.schema)))
    assert found == set(real.schema["$defs"])


@pytest.mark.parametrize("name", SHIPPED)
def test_shipped_recipes_are_valid(real, name):
    text = SHIPPED[name].read_text(encoding="utf-8")
    errors = [error.message for error in real.iter_errors(value(text))]
    assert errors == []
    again = dump(load_recipe(SHIPPED[name]).recipe)
    assert [error.message for error in real.iter_errors(value(again))] == []


def examples():
    room = neighbour("contract_examples", Path(__file__).parents[1] / "contracts" / "examples.py")
    for table in (room.SOURCE_EXAMPLES, room.STAGE_EXAMPLES):
        for kind, found in table.items():
            for number, example in enumerate(found):
                yield pytest.param(kind, example.settings, id=f"{kind}-{number}")


@pytest.mark.parametrize(("kind", "settings"), list(examples()))
def test_settings_of_every_member_are_valid_as_they_are_written(real, kind, settings):
    inner = "".join(f"  {line}\n" for line in dump(settings).splitlines())
    if kind in STAGES:
        text = f"{HEAD}signal: {{kind: noise, bandwidth: 1 MHz}}\nstages:\n- kind: {kind}\n{inner}"
    else:
        inner = inner.replace("signal: null", "signal: {kind: noise, bandwidth: 100 kHz}")
        text = f"{HEAD}signal:\n  kind: {kind}\n{inner}"
    assert [error.message for error in real.iter_errors(value(text))] == []
    load_text(text)


NOISE = "signal: {kind: noise, bandwidth: 1 MHz}\n"


@pytest.mark.parametrize(
    "line",
    [
        "duration: 140 symbols",
        "duration: 1/3 ms",
        "duration: {at: 10 ms, multiple: 16 samples, least: 1 ms, most: 20 ms}",
        "title: ''",
        "seed: 9223372036854775807",
        "output: {iq: [wav, {format: raw, datatype: ci8, name: a b}], average: -12 dBFS}",
        "output: {iq: [{format: raw, bits: 14, align: left}, {format: wav, bits: , align: }]}",
        "output: {iq: [{format: sigmf, real: {centre: 30 kHz}}, {format: raw, real: }]}",
        "second_channel: {signal: {kind: noise, bandwidth: 1 MHz}, level: -3 dB}",
        "second_channel:",
        "output: {peak: -0 dBFS}",
        "output: {peak: 0 dBFS}",
        "output: {iq: [{format: raw, name: , datatype: }]}",
        "bench: {average_power_at_device: -10 dBm, path: [{name: a, role: device}]}",
        "bench:",
        "sample_rate: 1625/6 kHz",
        "sample_rate: +1e3 Hz",
        "sample_rate: 0.05 Hz",
        "stages: [{kind: scale, gain: -3 dB}]",
        "stages: []",
    ],
)
def test_what_the_checker_takes(real, line):
    key = line.partition(":")[0]
    kept = [one for one in (HEAD + NOISE).splitlines() if not one.startswith(f"{key}:")]
    text = "\n".join([*kept, line]) + "\n"
    load_text(text)
    assert [error.message for error in real.iter_errors(value(text))] == []


@pytest.mark.parametrize(
    "line",
    [
        "titel: x",
        "sample_rate: 10000000",
        "sample_rate: 10 mHz",
        "sample_rate: 10 ms",
        "sample_rate: 0 Hz",
        "sample_rate: 0.00 MHz",
        "sample_rate: 0e3 Hz",
        "sample_rate: -1 MHz",
        "duration: 10",
        "duration: 10 MS",
        "duration: 0 ms",
        "duration: {least: 1 ms}",
        "duration: {at: 1 ms, min: 2 ms}",
        "seed: -1",
        "seed: 1.5",
        "seed: true",
        "title: [x]",
        "wavegen: 2",
        "wavegen: true",
        "signal: {bandwidth: 1 MHz}",
        "signal: {kind: nois, bandwidth: 1 MHz}",
        "signal: noise",
        "signal: [noise]",
        "signal: {kind: noise, bandwith: 1 MHz}",
        "signal: {kind: noise, bandwidth: 1}",
        "signal: {kind: scale, gain: 1 dB}",
        "stages: {kind: clip, ceiling: 8 dB}",
        "stages: [{kind: clip}]",
        "stages: [{kind: clip, ceiling: 8}]",
        "output: {iq: [sgmf]}",
        "output: {iq: [{format: raw, bits: 13, align: left}]}",
        "output: {iq: [{format: raw, bits: 14, align: middle}]}",
        "output: {iq: [{format: raw, real: 30 MHz}]}",
        "output: {iq: [{format: raw, real: {centre: 0 Hz}}]}",
        "second_channel: {level: -3 dB}",
        "output: {iq: []}",
        "output: {iq: [{fmt: wav}]}",
        "output: {iq: [{format: wav, datatype: ci8}]}",
        "output: {iq: [{format: wav, name: a/b}]}",
        "output: {peak: 1 dBFS}",
        "output: {peak: -1 dB}",
        "bench: {average_power_at_device: -10 dBm, path: []}",
        "bench: {average_power_at_device: -10 dBm, path: [{name: c, role: devise}]}",
    ],
)
def test_what_both_refuse(real, line):
    key = line.partition(":")[0]
    kept = [one for one in (HEAD + NOISE).splitlines() if not one.startswith(f"{key}:")]
    text = "\n".join([*kept, line]) + "\n"
    with pytest.raises(RecipeError):
        load_text(text)
    assert not is_valid(real, text)


@pytest.mark.parametrize("key", ["wavegen", "sample_rate", "duration", "signal"])
def test_missing_keys(real, key):
    kept = [one for one in (HEAD + NOISE).splitlines() if not one.startswith(f"{key}:")]
    assert not is_valid(real, "\n".join(kept))


def test_most_malformed_recipes_are_refused(tables):
    """Of those that a reader of YAML hands on; the rest break rules between characters or keys."""
    path = Path(__file__).parent / "malformed" / "test_malformed.py"
    cases = neighbour("malformed_cases", path).CASES
    validator = Draft202012Validator(recipe_schema(tables))
    passed, n_read = [], 0
    for case in cases:
        try:
            tree, faults = read_tree(case.text)
            found = plain(tree)
        except (FaultError, QuantityError):
            continue
        if faults:
            continue
        n_read += 1
        if validator.is_valid(found):
            passed.append(case.name)
    assert n_read > 80
    assert len(passed) <= 0.2 * n_read, passed
    good = neighbour("malformed_cases", path).GOOD
    assert validator.is_valid(value(HEAD + good))


def test_descriptions_and_choices_are_there_for_editors(real):
    properties = real.schema["properties"]
    assert "Hz" in properties["sample_rate"]["description"]
    assert properties["sample_rate"]["examples"] == ["3.84 MHz"]
    kinds = real.schema["$defs"]["signal"]["oneOf"]
    names = {one["$ref"].rpartition("/")[2] for one in kinds if "$ref" in one}
    assert {"kind.ofdm", "kind.single_carrier", "kind.sum"} <= names
    ofdm = real.schema["$defs"]["kind.ofdm"]
    assert ofdm["properties"]["kind"] == {"const": "ofdm"}
    assert all("description" in one or "const" in one for one in ofdm["properties"].values())
    assert "``" not in str(real.schema)


@dataclass(frozen=True)
class Silent:
    """A notation that does not describe itself."""

    given: object = None

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read anything."""
        return cls(value)


@dataclass(frozen=True)
class Spoken(Silent):
    """A notation that does."""

    @classmethod
    def json_schema(cls) -> dict[str, Any]:
        return {"enum": ["a", "b"]}


@dataclass(frozen=True, slots=True, kw_only=True)
class Noted:
    """Settings with both."""

    silent: Silent = Silent()
    spoken: Spoken = Spoken()
    many: tuple[int, str] = (1, "a")


def test_notations_describe_themselves_or_pass(tables, members):
    members.Noted = Noted
    more = Registry("source", {"noted": f"{members.__name__}:Noted"})
    validator = Draft202012Validator(recipe_schema({**tables, "signal": (more,)}))
    for settings, is_right in (
        ("silent: {x: [1]}", True),
        ("spoken: a", True),
        ("spoken: c", False),
        ("many: [1, a]", True),
        ("many: [1]", False),
        ("many: [1, a, 2]", False),
        ("many: [a, 1]", False),
    ):
        text = f"{HEAD}signal: {{kind: noted, {settings}}}\n"
        assert is_valid(validator, text) == is_right, settings
    assert is_valid(validator, f"{HEAD}signal: noted\n")
    described = validator.schema["$defs"]["Silent"]["description"]
    assert "does not describe itself. Read anything." in described


@pytest.mark.parametrize(("delays", "is_right"), [("[1 us, 2 ns]", True), ("[1 us, 2]", False)])
def test_units_inside_lists(tables, delays, is_right):
    text = f"{HEAD}signal: {{kind: carrier, symbol_rate: 1 MHz, delays: {delays}}}\n"
    assert is_valid(Draft202012Validator(recipe_schema(tables)), text) == is_right


def test_a_default_kind_may_be_left_out(tables):
    validator = Draft202012Validator(recipe_schema(tables))
    for data, is_right in (
        ("{share: x}", True),
        ("{kind: drawn}", True),
        ("{kind: counted, first: 3}", True),
        ("{first: 3}", False),
        ("{}", True),
        ("counted", True),
    ):
        text = f"{HEAD}signal: {{kind: carrier, symbol_rate: 1 MHz, data: {data}}}\n"
        assert is_valid(validator, text) == is_right, data


@pytest.mark.parametrize(
    ("marks", "right", "wrong"),
    [
        ((), ("-3 dB", "+3dB", " 1/3 dB ", "0 dB"), ("3", "dB", "3 dBm", "--3 dB", "3 dB x")),
        ((Gt(0),), ("3 dB", "+0.01 dB", "0.5 dB", "10 dB"), ("0 dB", "-3 dB", "-0 dB", "0.0 dB")),
        ((Ge(0),), ("3 dB", "0 dB", "-0 dB", "-0.0 dB"), ("-3 dB", "-0.5 dB")),
        ((Le(0),), ("-3 dB", "0 dB", "+0 dB"), ("3 dB", "+0.5 dB")),
        ((Lt(0),), ("-3 dB",), ("0 dB", "-0 dB", "3 dB")),
        ((Ge(1),), ("1 dB", "0.5 dB"), ("0 dB", "-1 dB")),
    ],
)
def test_quantities(marks, right, wrong):
    pattern = re.compile(quantity_schema(DIMENSIONS["_db"], marks)["pattern"])
    assert [text for text in right if not pattern.search(text)] == []
    assert [text for text in wrong if pattern.search(text)] == []
