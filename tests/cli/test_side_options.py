import argparse

import pytest

from wavegen.cli.side_options import (
    add_sides,
    add_verdict,
    count,
    reading_db,
    refuse_stray_overrides,
    side_of,
    verdict_of,
)
from wavegen.core.errors import ArgumentsError


@pytest.fixture
def parse():
    parser = argparse.ArgumentParser()
    add_sides(parser, ("input", "output"))

    def parse(*words):
        return parser.parse_args([*words])

    return parse


def test_for_both_and_for_one(parse):
    arguments = parse(
        "--format", "ci8", "--gate", "auto", "--output-gate", "markers", "--input-full-scale", "64"
    )
    one, two = (side_of(arguments, side, "x.bin") for side in ("input", "output"))
    assert (one.hints.format, two.hints.format) == ("ci8", "ci8")
    assert (one.hints.full_scale, two.hints.full_scale) == (64, None)
    assert (one.gate.by, two.gate.by) == ("level", "markers")
    assert not one.part.loops
    assert side_of(parse("--output-loop"), "output", "x.bin").part.loops
    assert not side_of(parse("--output-loop"), "input", "x.bin").part.loops


def test_recipes_take_changes_and_no_reading(parse, tmp_path):
    path = tmp_path / "ferry.yaml"
    path.write_text("wavegen: 1\n")
    side = side_of(parse("--set", "seed=3"), "input", str(path))
    assert side.is_recipe
    assert side.overrides == ("seed=3",)
    assert side_of(parse("--set", "seed=3"), "output", "x.bin").overrides == ()
    with pytest.raises(ArgumentsError):
        side_of(parse("--reading", "0.1dB"), "input", str(path))


def test_changes_to_no_recipe(parse):
    arguments = parse("--set", "seed=3")
    sides = tuple(side_of(arguments, side, "x.bin") for side in ("input", "output"))
    with pytest.raises(ArgumentsError):
        refuse_stray_overrides(arguments, sides)
    with pytest.raises(ArgumentsError):
        side_of(parse("--input-set", "seed=3"), "input", "x.bin")


@pytest.mark.parametrize(("text", "value"), [("1000", 1000), ("1e6", 1_000_000)])
def test_counts(text, value):
    assert count(text) == value


@pytest.mark.parametrize("text", ["0", "-1", "1.5", "x", "inf", "nan", "1e30"])
def test_no_counts(text):
    with pytest.raises(argparse.ArgumentTypeError):
        count(text)


@pytest.mark.parametrize("text", ["-0.1dB", "11dB", "0.1", "x"])
def test_no_reading_errors(text):
    with pytest.raises(argparse.ArgumentTypeError):
        reading_db(text)


def test_only_what_is_said_of_the_verdict_is_handed_on():
    parser = argparse.ArgumentParser()
    add_verdict(parser, tolerance="x", down_to="y")
    assert verdict_of(parser.parse_args([])) == {}
    said = parser.parse_args(["--tolerance", "0.5dB", "--down-to", "1%"])
    assert verdict_of(said) == {"tolerance_db": 0.5, "down_to": 0.01}
    with pytest.raises(SystemExit):
        parser.parse_args(["--down-to", "2"])
