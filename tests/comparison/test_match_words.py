from dataclasses import replace

import numpy as np
import pytest

from wavegen.comparison.difference import as_recorded, compare
from wavegen.comparison.match_words import called, percent, statement
from wavegen.comparison.needed_samples import needed_samples


@pytest.fixture
def said(side):
    """The sentence about two arrays as recordings."""

    def said(*arrays, is_of_records=False, duty=None, **settings):
        sides = tuple(
            replace(side(array, name, loops=False), duty=duty)
            for array, name in zip(arrays, "ab", strict=True)
        )
        curves = [item.curve for item in sides]
        recorded = compare(*map(as_recorded, curves), **settings)
        found = recorded if is_of_records else compare(*curves, **settings)
        plans = needed_samples(*curves, found)
        return statement(found, recorded, plans, sides, is_of_records=is_of_records)

    return said


def test_a_match_and_a_difference(said, noise):
    samples = noise(1 << 18)
    wall = samples / np.maximum(np.abs(samples), 1)
    text = said(samples, noise(1 << 18), down_to=0.1)
    assert text == "match: a and b agree within 0.2 dB down to 10 %"
    text = said(samples, wall, down_to=0.1)
    assert text.startswith("differ: a stands ")
    assert " dB below b at 50 %, surely by -" in text  # its mean stands higher
    assert " dB above b at 50 %, surely by +" in said(wall, samples, down_to=0.1)
    text = said(samples, wall, down_to=0.1, is_of_records=True)
    assert text.startswith("differ: as recorded, a stands ")
    assert text.endswith(" dB below b at 50 %")


def test_an_undecided_one_says_first_how_the_records_differ(said, noise):
    first, second = noise(1 << 13), noise(1 << 13)
    text = said(first, second)
    assert text.startswith("undecided: as recorded a stands ")
    assert "by chance; whether a and b agree within 0.2 dB down to 0.01 % cannot be told" in text
    assert "would show a match, if they are alike" in text
    assert " ms) of b more" in text  # at 1 MHz
    assert "samples of on-time (" in said(first, second, duty=0.5)


def test_records_that_agree_may_still_be_undecided(said, noise):
    samples = noise(1 << 13)
    text = said(samples, samples)
    assert text.startswith("undecided: as recorded they agree within 0.2 dB; whether")


def test_sides_of_one_name_are_called_by_what_they_are(side, noise):
    first, second = (side(noise(1 << 12), name) for name in "ab")
    assert called(first, second) == ("a", "b")
    assert called(first, first) == ("the stimulus", "the field")


@pytest.mark.parametrize(
    ("probability", "words"), [(0.5, "50 %"), (1e-4, "0.01 %"), (0.012345, "1.2 %")]
)
def test_percent(probability, words):
    assert percent(probability) == words
