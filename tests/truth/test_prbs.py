"""Sequences of ITU-T O.150: first bits, ones, longest runs and hashes of whole periods.

The rows and how far each is confirmed: ``data/prbs.json``.
"""

import hashlib
import json
from pathlib import Path

import numpy as np
import pytest

from wavegen.dsp.prbs import PRBS

TABLE = json.loads(Path(__file__).with_name("data").joinpath("prbs.json").read_text())
ROWS = {row["name"]: row for row in TABLE["rows"]}
WHOLE = [name for name, row in ROWS.items() if row["order"] <= 23]


def longest_run(bits, value):
    """On the circle: the period is turned to begin with the other value."""
    turned = np.roll(bits, -int(np.flatnonzero(bits != value)[0]))
    breaks = np.flatnonzero(np.append(turned != value, True))  # the end breaks too
    return int(np.max(np.diff(breaks)) - 1)


@pytest.mark.parametrize("name", ROWS)
def test_register(name):
    row, made = ROWS[name], PRBS[name]
    assert (made.order, made.tap, made.period) == (row["order"], row["tap"], row["period"])
    assert made.is_inverted == row["inverted"]
    assert set(ROWS) == set(PRBS)


@pytest.mark.parametrize("name", ROWS)
def test_first_bits(name):
    assert "".join(map(str, PRBS[name].bits(0, 64))) == ROWS[name]["first_64_bits"]


@pytest.mark.parametrize("name", WHOLE)
def test_a_whole_period(name):
    row, made = ROWS[name], PRBS[name]
    bits = made.bits(0, made.period)
    assert np.count_nonzero(bits) == row["ones_per_period"]
    assert longest_run(bits, 0) == row["longest_zero_run"]
    if name != "pn20_zs":  # a maximum-length sequence: order, and one less of the other value
        assert longest_run(bits, 1) == row["order"] - row["inverted"]
    text = (bits + np.uint8(ord("0"))).tobytes()
    assert hashlib.sha256(text).hexdigest() == row["sha256_of_one_period_as_ascii"]


@pytest.mark.parametrize("name", ["pn29", "pn31"])
def test_the_longest_run_of_the_longest_sequences(name):
    # the run that the start makes is the only one of its length: bits around the seam of a period
    row, made = ROWS[name], PRBS[name]
    around = made.bits(made.period - 200, 400)
    assert longest_run(around, 0) == row["longest_zero_run"]
    assert np.array_equal(around[200:264], made.bits(0, 64))
