from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.files.datatypes import CF32_LE
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import NoLaw
from wavegen.meters.batches import measure_batches
from wavegen.production.judgement import DEFAULT, ON_TIME, WHOLE, judge
from wavegen.production.law_rows import (
    curve_rows,
    judgement_rows,
    law_document,
    level_grid,
    process_rows,
)


@pytest.fixture(scope="module")
def codes():
    rng = np.random.default_rng(1)
    samples = rng.standard_normal(40_000) + 1j * rng.standard_normal(40_000)
    found = measure_batches(samples.astype(np.complex64))
    return SimpleNamespace(statistics=found.statistics, on_statistics=None, sampled=found)


def test_the_curve_runs_from_30_db_below_to_1e_9():
    rows = curve_rows(GaussianLaw(), (0.1, 1e-9))
    assert rows["level_db"][0] == -30
    assert rows["probability"][-1] <= 1e-9 < rows["probability"][-3]
    assert rows["levels"][0] == {"probability": 0.1, "level_db": 3.6222}
    assert rows["peak_db"] is None
    assert rows["lowest_probability"] == 0


def test_the_grid():
    grid = level_grid(-29.91)
    np.testing.assert_allclose(grid, [-30, -29.95, -29.9, -29.85], atol=1e-9)


def test_a_verdict_with_what_it_rests_on(codes):
    found = judge(GaussianLaw(), codes, CF32_LE, DEFAULT)
    rows = judgement_rows(found)
    assert rows["tolerance_db"] == 0.2
    assert rows["down_to"] == 1e-4
    assert [row["probability"] for row in rows["compared"]][:3] == [
        0.1,
        pytest.approx(10**-1.5),
        0.01,
    ]
    for row in rows["compared"]:
        assert row["low_db"] is None or row["low_db"] <= row["level_db"]
    assert [row["order"] for row in rows["moments"]] == [2, 3]
    document = law_document(GaussianLaw(), found)
    assert document["verdict"] == found.verdict
    assert law_document(NoLaw(reason="x"), None) is None


def test_the_process_is_named_beside_the_loop(codes):
    rows = process_rows(codes)
    assert rows["is"] == "the process it samples"
    assert rows["of"] == WHOLE
    assert rows["n_samples"] == 40_000
    low, level, high = (rows["levels"][1][key] for key in ("low_db", "level_db", "high_db"))
    assert low < level < high
    assert low < 6.632 < high
    gated = SimpleNamespace(**vars(codes) | {"on_statistics": codes.statistics})
    assert process_rows(gated)["of"] == ON_TIME
    assert process_rows(SimpleNamespace(sampled=None)) is None
