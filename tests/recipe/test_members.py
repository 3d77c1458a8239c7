"""Every member of every table, as a recipe meets it: odd values are told, sound ones come back."""

import dataclasses
from collections.abc import Iterator
from typing import Any, get_args

import pytest

from wavegen.core.registry import Registry
from wavegen.core.units import QuantityError
from wavegen.files import FORMATS
from wavegen.recipe import format_request as requests_module
from wavegen.recipe.checker import check, fields_of
from wavegen.recipe.dump import dump
from wavegen.recipe.find import shipped_recipes
from wavegen.recipe.format_request import FormatRequest
from wavegen.recipe.load import load_recipe, load_text
from wavegen.recipe.reader import read_tree
from wavegen.recipe.tables import TABLES, members

MEMBERS = [(table, kind) for table in TABLES for kind in members(TABLES, (table,))]

ODD = [
    "",
    "~",
    "true",
    "no",
    "0",
    "-1",
    "1e99",
    "-1e-99",
    "9" * 64,
    "9" * 400,
    ".inf",
    ".nan",
    "0o17",
    "1/0",
    "1/3",
    "x",
    '""',
    '"\\u0000"',
    "-5 Hz",
    "1e99 MHz",
    "3 mHz",
    "-1e99 dB",
    "1 samples",
    "1..99999999999",
    "0 x 1/4",
    "99999999999 x 1/4",
    "[]",
    "[[]]",
    "[[1]]",
    "[[1, 2], [3]]",
    "[[0, 0], [0, 0]]",
    "[[1e99, 1e99], [1, true]]",
    "[~]",
    "[{}]",
    "[x, 1, true]",
    "{}",
    "{kind: }",
    "{kind: x}",
    "{random: x}",
    "{random: [1]}",
    "{at: 1 ms}",
    "{? 1: 2}",
]


@pytest.fixture(autouse=True)
def formats(monkeypatch: pytest.MonkeyPatch) -> Registry:
    """Use the real formats here."""
    monkeypatch.setattr(requests_module, "FORMATS", FORMATS)
    return FORMATS


def within(hint: Any) -> Iterator[Any]:
    """Yield the settings classes that a hint mentions, and those inside them."""
    for inner in get_args(hint):
        yield from within(inner)
    if dataclasses.is_dataclass(hint) and isinstance(hint, type) and not hasattr(hint, "parse"):
        yield hint
        for _, inner in fields_of(hint).values():
            yield from within(inner)


@pytest.mark.parametrize(("table", "kind"), MEMBERS)
def test_odd_values_are_read_or_told(table: str, kind: str) -> None:
    for settings in within(members(TABLES, (table,))[kind].load(kind)):
        for key in fields_of(settings):
            for value in ODD:
                _, faults = check(read_tree(f"{{{key}: {value}}}")[0], settings)
                for fault in faults:
                    assert fault.problem
                    assert fault.allowed
                    assert fault.remedy


HEAD = "wavegen: 1\nsample_rate: 61.44 MHz\nduration: 1 ms\nsignal: "
OFDM = "kind: ofdm, subcarrier_spacing: 15 kHz, cyclic_prefix: [160/2048, 6 x 144/2048]"

SOUND = [
    "{kind: noise, bandwidth: 1.4 MHz}",
    "{kind: carrier}",
    "{kind: tones, count: 8, spacing: 1/3 kHz, phases: newman}",
    "{kind: tones, tones: [{frequency_offset: -1 kHz, phase: 30 deg}, {frequency_offset: 0 Hz}]}",
    "{kind: single_carrier, constellation: 8psk, symbol_rate: 1625/6 kHz}",
    (
        "{kind: single_carrier, constellation: [[1, 0.5], [-1, 0], [0, 0.1], [0, -1]], "
        "symbol_rate: 1 MHz, data: {share: other}}"
    ),
    (
        "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, "
        "pulse: {kind: root_raised_cosine, roll_off: 0.35, span: 20 symbols}}"
    ),
    "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, pulse: rectangular}",
    (
        "{kind: single_carrier, constellation: 16apsk 2/3, symbol_rate: 1 MHz, rotation: 3pi/8, "
        "data: {kind: prbs, sequence: pn20_zs, start: 7, inverted: true}}"
    ),
    (
        "{kind: single_carrier, constellation: {rings: [4, 12], ratios: [2.85], "
        "phases: [45 deg, 15 deg]}, symbol_rate: 1 MHz, pulse: {kind: taps, file: taps.txt}}"
    ),
    (
        "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, stagger: true, "
        'pulse: half_sine, data: {kind: pattern, bits: "0011"}}'
    ),
    (
        "{kind: single_carrier, constellation: 8psk, symbol_rate: 1 MHz, differential: true, "
        "pulse: {kind: gaussian, bt: 0.5, symbols: impulses}, data: {kind: file, path: a/b.bin}}"
    ),
    (
        f'{{{OFDM}, edge_window: 16 samples, groups: [{{subcarriers: "-6..-1, 1..6", '
        "constellation: 64qam, level: -1.5 dB, data: {share: a}}]}"
    ),
    (
        f'{{{OFDM}, groups: [{{subcarriers: "0..40 by 4", constellation: qpsk}}], pilots: ['
        "{subcarriers: [1, 2, 3], values: [1, -1, [0.5, 0.25]]}, "
        "{subcarriers: 5, values: {random: 16qam}, level: 3 dB}]}"
    ),
    (
        "{kind: sum, parts: [{signal: {kind: carrier}, frequency_offset: 1/3 MHz, name: a}, "
        "{signal: {kind: noise, bandwidth: 1 MHz}, level: -30 dB, phase: 12.5 deg, "
        "stages: [{kind: clip, ceiling: 7 dB}]}]}"
    ),
]


@pytest.mark.parametrize("signal", SOUND)
def test_settings_come_back(signal: str) -> None:
    recipe = load_text(HEAD + signal + "\n").recipe
    text = dump(recipe)
    again = load_text(text).recipe
    assert again == recipe
    assert dump(again) == text


@pytest.mark.parametrize("name", [name for name, _, _ in shipped_recipes()])
def test_shipped_recipes_come_back(name: str) -> None:
    path = next(path for found, _, path in shipped_recipes() if found == name)
    loaded = load_recipe(path)
    assert loaded.recipe.title
    assert load_text(dump(loaded.recipe)).recipe == loaded.recipe


@pytest.mark.parametrize("name", list(FORMATS))
def test_every_format_takes_its_datatypes_and_no_other(name: str) -> None:
    plain = FormatRequest.parse(name)
    assert plain.text() == name
    for datatype, about in FORMATS.load(name).datatypes.items():
        given = {"format": name, "datatype": datatype}
        real = {"real": {"centre": "30 MHz"}}
        made = FormatRequest.parse(given | (real if about.is_real else {}))
        assert FormatRequest.parse(made.text()) == made
        with pytest.raises(QuantityError) as caught:
            FormatRequest.parse(given | ({} if about.is_real else real))
        assert caught.value.key in {"datatype", "real"}
    with pytest.raises(QuantityError) as caught:
        FormatRequest.parse({"format": name, "datatype": "ci7"})
    assert caught.value.key == "datatype"
