from fractions import Fraction

import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.site import Cycle
from wavegen.production.length import MOST_SAMPLES, in_samples, loop_length
from wavegen.recipe.settings import Duration, Extent

RATE = Fraction(2_500_000)
METER = Cycle(n_samples=120, n_symbols=13)
"""1625/6 kHz at 2.5 MHz: 2.5e6 / (1625000/6) = 120/13 samples a symbol."""
ANY = Cycle(n_samples=1)


def length(duration, cycle=METER, rate=RATE):
    return loop_length(Duration.parse(duration), cycle, rate)


def refusal(duration, cycle=METER, rate=RATE):
    with pytest.raises(RecipeError) as caught:
        length(duration, cycle, rate)
    return caught.value


@pytest.mark.parametrize(
    ("asked", "n_samples"),
    [
        ("48 us", 120),
        ("13 symbols", 120),
        ("120 samples", 120),
        ("26000 symbols", 240_000),
        ("96 ms", 240_000),
        ({"at": "48 us", "multiple": "8 samples"}, 120),
        ({"at": "240 samples", "multiple": "16 samples"}, 240),
        ({"at": "240 samples", "multiple": "26 symbols"}, 240),
        ({"at": "48 us", "least": "120 samples", "most": "13 symbols"}, 120),
    ],
)
def test_what_fits_is_kept_without_a_note(asked, n_samples):
    assert length(asked) == (n_samples, [])


@pytest.mark.parametrize(
    ("asked", "n_samples"),
    [
        ("100 samples", 120),
        ("60 samples", 120),
        ("14 symbols", 120),
        ("179 samples", 120),
        ("180 samples", 240),
        ("40 ms", 99_960),
        ({"at": "1 ms", "multiple": "32 samples"}, 2400),
        ({"at": "100 samples", "least": "100 samples"}, 120),
        ({"at": "170 samples", "least": "150 samples"}, 240),
        ({"at": "190 samples", "most": "239 samples"}, 120),
    ],
)
def test_what_is_rounded_is_told_with_old_and_new_value(asked, n_samples):
    given, notes = length(asked)
    assert given == n_samples
    (note,) = notes
    at = asked["at"] if isinstance(asked, dict) else asked
    assert (note.kind, note.where, note.asked) == ("rounded", "duration", at)
    assert f"({n_samples} samples)" in note.given
    quantum = 480 if isinstance(asked, dict) and "multiple" in asked else 120
    assert f"{quantum}-sample" in note.text


def test_whole_numbers_stay_exact_at_a_rational_rate():
    # 40 s at 1625/6 kHz is no whole number of symbols; at 2.5 MHz it is 1e8 samples exactly.
    assert in_samples(Extent.parse("40 s"), METER, RATE, "duration") == 100_000_000
    n_samples, _ = length("1200 s")
    assert n_samples == 3_000_000_000
    assert Fraction(n_samples * 13, 120).denominator == 1
    rate = Fraction(1_625_000, 6)
    n_samples, notes = loop_length(Duration.parse("12 ms"), ANY, rate)
    assert (n_samples, notes) == (3250, [])


def test_symbols_of_a_signal_without_them():
    error = refusal("10 symbols", ANY)
    assert error.where == "duration"
    assert "10 symbols" in error.problem


def test_symbols_in_a_limit_of_a_signal_without_them():
    assert refusal({"at": "1 ms", "most": "10 symbols"}, ANY).where == "duration.most"


def test_no_fit_says_what_would_fit():
    error = refusal({"at": "50 us", "least": "125 samples", "most": "60 us"})
    assert error.where == "duration"
    assert "(120 samples)" in error.problem
    assert "least 125 samples" in error.problem
    assert "most 60 us" in error.problem
    assert "(240 samples)" in error.allowed


def test_shorter_than_the_shortest_loop():
    error = refusal("59 samples")
    assert "59 samples" in error.problem
    assert "48 µs (120 samples)" in error.allowed


def test_a_multiple_that_makes_the_loop_far_longer():
    error = refusal({"at": "120 samples", "multiple": "32 samples"})
    assert "(480 samples)" in error.allowed


def test_a_multiple_between_two_samples():
    error = refusal({"at": "1 ms", "multiple": "1 symbols"})
    assert error.where == "duration.multiple"
    assert "9.23077 samples" in error.problem


@pytest.mark.parametrize(
    "asked",
    [
        "2000 s",
        {"at": "10 ms", "most": "240 samples"},
        {"at": "1 ms", "least": "240000 samples"},
    ],
)
def test_a_length_outside_its_limits_is_not_bent_to_them(asked):
    error = refusal(asked)
    assert error.where == "duration"
    assert "samples)" in error.allowed


def test_the_longest_loop_is_a_limit_of_the_program():
    assert loop_length(Duration.parse("4000 s"), ANY, Fraction(10**6)) == (MOST_SAMPLES, [])
    assert f"({MOST_SAMPLES} samples)" in refusal("4001 s", ANY, Fraction(10**6)).allowed
    assert "most 4000000000 samples" in refusal("1 s", Cycle(n_samples=MOST_SAMPLES + 1)).problem
