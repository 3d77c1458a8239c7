import numpy as np
import pytest

from wavegen.meters.power import measure_samples
from wavegen.production import measured_rows as rows
from wavegen.reports.measurement import lines, tables


@pytest.fixture(scope="module")
def document():
    rng = np.random.default_rng(1)
    statistics = measure_samples(rng.standard_normal(20_000).astype(np.float32).view(np.complex64))
    asked = (0.1, 0.01, 1e-6)
    return {
        "name": "x", "is": "a recording", "statistic": "CCDF of it", "is_power": False,
        "sample_rate_hz": 1e6, "duration_s": 0.01, "n_samples": 10_000, "n_zeros": 0,
        "mean_dbfs": 0.0, "peak_dbfs": 9.0, "papr_db": 9.0, "peak_between_samples_dbfs": 9.5,
        "papr_between_samples_db": 9.5, "averages": rows.averages(statistics),
        "levels": [
            {
                "probability": q, "level_db": 3.0, "low_db": 2.5, "high_db": high,
                "resolved": q > 1e-5,
            }
            for q, high in zip(asked, (3.5, None, None), strict=True)
        ],
    }  # fmt: skip


def column(table, heading):
    place = table.headings.index(heading)
    return [row[place] for row in table.rows]


def test_levels_and_what_is_known_of_the_process(document):
    process = {"says": None, "levels": document["levels"], "n_data_periods": None}
    _, levels = tables(document | {"process": process})
    assert column(levels, "this record") == ["3.00 dB", "3.00 dB", "too few samples"]
    assert column(levels, "process, 95 %") == ["2.50 to 3.50 dB", "from 2.50 dB", "from 2.50 dB"]
    assert column(levels, "complex Gaussian")[0] == "3.62 dB"


def test_of_a_loop_every_level_is_shown(document):
    loop = document | {"is": "this loop"}
    _, levels = tables(loop)
    assert column(levels, "this loop") == ["3.00 dB", "3.00 dB", "loop too short"]


def test_averages_of_other_kinds_are_told_for_what_is_not_constant(document):
    assert any("of dB" in row[0] for row in tables(document)[0].rows)
    constant = document | {"averages": {"of_decibels_db": 0.0, "of_volts_db": 0.0}}
    assert not any("of dB" in row[0] for row in tables(constant)[0].rows)


def test_sentences(document):
    assert lines(document) == []
    says = {"says": "the same for every loop"}
    assert "the same for every loop" in lines(document | {"process": says})[0]
    process = {
        "says": None, "n_data_periods": 10, "n_samples": 511,
        "next_decade": {"probability": 1e-4, "n_samples": 10**6, "duration_s": 1.0, "times": 7.0},
    }  # fmt: skip
    repeats, needed = lines(document | {"process": process})
    assert "511 samples" in repeats
    assert "10 times" in repeats
    assert "0.01 %" in needed
    assert "1000000 samples" in needed


def test_views_stand_under_their_own_names(document):
    rng = np.random.default_rng(2)
    noise = measure_samples(rng.standard_normal(20_000).astype(np.float32).view(np.complex64))
    shown = document | {
        "levels": rows.exact_levels(noise, (0.1, 0.01, 1e-6)),
        "rf": rows.rf_rows(noise, (0.1, 0.01, 1e-6)),
        "time_shares": [
            {
                "level_db": 3.0, "level_dbfs": 3.0, "level_dbm": 1.0, "above_percent": 12.5,
                "below_percent": 87.5, "above_low_percent": 12.0, "above_high_percent": 13.0,
            }
        ],
        "per_symbol": {
            "is": "CCDF of the PAPR of each symbol", "n_symbols": 50, "law": None,
            "over": [
                {
                    "mean": "ensemble",
                    "levels": [
                        {"share_of_symbols": 0.1, "papr_db": 8.0, "resolved": False},
                    ],
                }
            ],
        },
    }  # fmt: skip
    titles = [table.title for table in tables(shown)]
    assert any("RF power" in title for title in titles)
    assert any("Share of the time" in title for title in titles)
    (symbols,) = [table for table in tables(shown) if "symbol" in table.title]
    assert "not that of the power" in symbols.title
    assert symbols.rows == (("10 %", "too few symbols"),)
