import argparse

import pytest

from wavegen.cli import question_options as options
from wavegen.meters import equivalence


def parsed(*given, **how):
    parser = argparse.ArgumentParser()
    options.add_question(parser, **how)
    return parser.parse_args(given)


def test_defaults_are_those_of_the_verdict():
    found = parsed()
    assert (found.tolerance, found.down_to) == (equivalence.TOLERANCE_DB, equivalence.DOWN_TO)
    stated = parsed(tolerance="--law-tolerance", is_stated=True)
    assert options.question_of(stated.law_tolerance, stated.down_to) is None


def test_what_is_asked():
    found = parsed("--tolerance", "0.5dB", "--down-to", "0.1%")
    asked = options.question_of(found.tolerance, found.down_to)
    assert (asked.tolerance_db, asked.down_to) == (0.5, pytest.approx(1e-3))
    asked = options.question_of(None, 0.01)
    assert asked.tolerance_db == equivalence.TOLERANCE_DB
    assert options.question_of(0.1, None).down_to == equivalence.DOWN_TO


@pytest.mark.parametrize(
    ("read", "text"),
    [
        (options.law_tolerance_db, "0dB"),
        (options.law_tolerance_db, "-1dB"),
        (options.law_tolerance_db, "0.2"),
        (options.least_probability, "20%"),
        (options.least_probability, "0"),
        (options.tries, "1"),
        (options.tries, "2.5"),
        (options.tries, "10001"),
        (options.tries, "1" * 400),
        (options.tries, "two"),
    ],
)
def test_refused(read, text):
    with pytest.raises(argparse.ArgumentTypeError, match=r"allowed|like"):
        read(text)


def test_numbers_of_seeds():
    assert options.tries("2") == 2
    assert options.tries("10000") == 10_000
