"""The bench sheet in words."""

import pytest

from wavegen.production.bench import engineering
from wavegen.production.bench_sheet import SheetFacts, bench_sheet
from wavegen.recipe.bench import Bench, PathStage
from wavegen.reports.bench_sheet import (
    allowance_words,
    rating_table,
    sensor_words,
    sheet_page,
    tables,
)
from wavegen.reports.pages.page import html_of


@pytest.fixture
def sheet():
    path = (
        PathStage(name="cable <b>", role="cable", gain_db=-1.0, peak_limit_dbm=-30.0),
        PathStage(name="amplifier", role="device", gain_db=46.0, vswr=3.0),
        PathStage(name="head", role="sensor", video_bandwidth_hz=5e6),
    )
    document = {
        "title": "T",
        "recipe": {"name": "t"},
        "mean_dbfs": -12.0,
        "peak_between_samples_dbfs": -1.0,
        "on_time": None,
        "sample_rate_hz": 100e6,
        "n_samples": 100_000,
        "duration_s": 1e-3,
        "files": [{"name": "t.sigmf-data", "sha512": "ab", "bits": None, "datatype": "ci16_le"}],
    }
    facts = SheetFacts(
        longest_burst_s=None,
        first_sample_db=-3.0,
        last_sample_db=None,
        bandwidth_hz=10e6,
        unreduced_papr_db=None,
    )
    return bench_sheet(Bench(average_power_at_device_dbm=-20.0, path=path), document, facts)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (19.9526, "20 V"),
        (1.2589e-3, "1.26 mV"),
        (0.99999, "1 V"),
        (4.2e-15, "0.0042 pV"),
        (1e9, "1e+03 MV"),
    ],
)
def test_values_with_prefixes(value, text):
    assert engineering(value, "V") == text


def test_an_exceeded_rating_is_shouted(sheet):
    table = rating_table(sheet)
    assert table is not None
    assert table.rows[0][0] == "cable <b>.peak_limit"
    # -19 dBm and 11 dB of PAPR at the cable's input: -8 dBm against -30
    assert table.rows[0][-1] == "EXCEEDED by 22.00 dB"


def test_a_sensor_that_is_too_slow_is_named(sheet):
    (said,) = sensor_words(sheet)
    assert "5 MHz" in said
    assert "too low" in said


def test_tables_have_as_many_cells_as_headings(sheet):
    found = tables(sheet)
    assert len(found) == 7
    for table in found:
        assert {len(row) for row in table.rows} == {len(table.headings)}


def test_the_page_holds_levels_order_of_work_and_cautions(sheet):
    html = html_of(sheet_page([sheet]))
    assert "-19.00 dBm if the generator" in html
    assert "RF off." in html
    assert "Radiate only with a licence" in html
    assert "cable &lt;b&gt;" in html
    assert "begins at -23.00 dBm and ends at nothing" in html
    assert "No allowance is taken" in html


def test_allowances_in_words(sheet):
    kept = sheet | {"allowances": {"level_uncertainty_db": 0.5, "overshoot_db": 0.3}}
    assert "0.5 dB higher" in allowance_words(kept)
    assert "0.3 dB" in allowance_words(kept)
