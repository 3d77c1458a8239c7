"""Tables of phases against the sum that they stand for."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp import phase_tables
from wavegen.dsp.phase_pulses import (
    four_level_phase,
    gaussian_phase,
    rectangular_phase,
    soqpsk_tg_phase,
)
from wavegen.dsp.phase_tables import MOST_PHASES, PhaseTables, states_of

BINARY = (-1, 1)
CASES = {
    "direct": (gaussian_phase(0.3), BINARY, Fraction(1, 2), 8),
    "groups": (gaussian_phase(0.5), (-3, -1, 1, 3), Fraction(63, 200), 12),
    "many groups": (four_level_phase(), (-3, -1, 1, 3), Fraction(1, 4), 5),
    "ternary": (soqpsk_tg_phase(), (-1, 0, 1), Fraction(1, 2), 8),
    "interpolated": (gaussian_phase(0.3), BINARY, Fraction(8, 25), MOST_PHASES + 1),
    "interpolated, kinks": (rectangular_phase(), BINARY, Fraction(7, 10), 99_991),
}
START = Fraction(3, 8)


def case(name, seed=5, count=40):
    pulse, alphabet, index, n_phases = CASES[name]
    tables = PhaseTables(
        pulse=pulse, alphabet=alphabet, index=index, start_turns=START, n_phases=n_phases
    )
    rng = np.random.default_rng(seed)
    numbers = rng.integers(0, len(alphabet), count + pulse.n_near - 1).astype(np.uint8)
    levels = np.array(alphabet)[numbers]
    before = 10**6 + 1  # levels of the symbols finished before the first interval
    sums = before + np.concatenate([[0], np.cumsum(levels[: count - 1])])
    return tables, numbers, levels, sums.astype(np.int64)


def expected(tables, levels, sums, interval, time):
    """Turns by the definition: finished symbols and those still turning, float64."""
    near = tables.pulse.n_near
    turns = float(START) + float(tables.index) * (sums[interval] % tables.n_states) / 2
    for place in range(near):
        q = tables.pulse.values(time + tables.pulse.last_symbols - 1 - place)
        turns = turns + float(tables.index) * levels[interval + place] * q
    return np.exp(2j * np.pi * turns)


def test_the_forms_are_those_meant():
    made = {name: case(name)[0] for name in CASES}
    direct = {name for name, tables in made.items() if tables.is_direct}
    between = {name for name, tables in made.items() if tables.is_interpolated}
    assert direct == {"direct", "ternary"}
    assert between == {"interpolated", "interpolated, kinks"}
    assert len(made["groups"].sizes) == 1
    assert len(made["many groups"].sizes) > 4
    for tables in made.values():
        assert sum(tables.sizes) == tables.pulse.n_near


@pytest.mark.parametrize("name", [name for name in CASES if "interpolated" not in name])
def test_whole_symbols_and_places(name):
    # complex64 rounds to 6e-8 a part; with an angle up to pi rounded to float32 1.2e-7 more
    tables, numbers, levels, sums = case(name)
    codes = tables.codes(numbers, sums)
    out = np.empty(sums.size * tables.n_places, np.complex64)
    tables.whole_symbols(codes, out)
    interval = np.repeat(np.arange(sums.size), tables.n_places)
    place = np.tile(np.arange(tables.n_places), sums.size)
    want = expected(tables, levels, sums, interval, place / tables.n_places)
    assert np.max(np.abs(out - want)) < 3e-7
    again = np.empty_like(out)
    tables.at_places(codes, interval, place, again)
    assert again.tobytes() == out.tobytes()


@pytest.mark.parametrize("name", ["interpolated", "interpolated, kinks"])
def test_between_places(name):
    tables, numbers, levels, sums = case(name)
    rng = np.random.default_rng(1)
    interval = rng.integers(0, sums.size, 5000)
    time = rng.random(5000)
    time[:3] = 0.0, 0.5, np.nextafter(1.0, 0.0)
    out = np.empty(5000, np.complex64)
    tables.between_places(tables.codes(numbers, sums), interval, time, out)
    want = expected(tables, levels, sums, interval, time)
    # float32 angle and sine as above, 5e-8 rad by the straight lines
    assert np.max(np.abs(out - want)) < 3.5e-7


def test_straight_lines_miss_by_no_more_than_promised():
    tables = case("interpolated")[0]
    assert tables.n_places > 256
    coarse = tables.n_places // 2
    assert tables._linear_error_rad(tables.n_places) <= phase_tables.LINEAR_ERROR_RAD
    assert tables._linear_error_rad(coarse) > phase_tables.LINEAR_ERROR_RAD
    table = tables.groups[0].astype(np.float64) / phase_tables.TURN
    assert table.size == len(BINARY) ** tables.sizes[0] * (tables.n_places + 1)


def test_states():
    assert [states_of(Fraction(x)) for x in ("1/2", "1", "2", "2/3", "0.7", "1/4")] == [
        4, 2, 1, 3, 20, 8,
    ]  # fmt: skip
    tables = case("direct")[0]
    turns = tables.states.astype(np.float64) / 2**32
    assert turns == pytest.approx([0.375, 0.625, 0.875, 0.125])
