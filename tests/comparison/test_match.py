import json

import numpy as np
import pytest

from wavegen.comparison.match import MatchSettings, match
from wavegen.comparison.side import SideSettings
from wavegen.core.errors import SignalError
from wavegen.files.format import ReadHints
from wavegen.production.subject_files import FilePart


@pytest.fixture
def written(tmp_path, noise):
    def written(name, samples=None, *, rate_hz=1_000_000, level_dbm=None, loops=False):
        path = tmp_path / f"{name}.cf32_le"
        np.asarray(noise(1 << 15) if samples is None else samples, "<c8").tofile(path)
        hints = ReadHints(sample_rate_hz=rate_hz, reference_level_dbm=level_dbm)
        return SideSettings(subject=str(path), hints=hints, part=FilePart(loops=loops))

    return written


PLAIN = MatchSettings(looks=False)


def test_two_loops_are_decided_exactly(written, noise):
    samples = noise(1 << 15)
    sides = [written(name, samples, loops=True) for name in ("first", "second")]
    found = match(*sides, PLAIN)
    assert found["verdict"] == "match"
    assert found["largest_difference_db"] == 0
    assert found["needed"] is None
    clipped = samples / np.maximum(np.abs(samples) / 2, 1)
    found = match(
        written("first", samples, loops=True), written("second", clipped, loops=True), PLAIN
    )
    assert found["verdict"] == "differ"
    assert found["largest_difference_db"] > 3
    assert "first.cf32_le stands" in found["statement"]
    json.dumps(found, allow_nan=False)


def test_short_recordings_are_undecided_and_it_is_said_how_much_more(written):
    found = match(written("one"), written("two"), PLAIN)
    assert found["verdict"] == "undecided"
    assert found["resolved_to"] > 1e-4
    assert found["needed"]["more_field_samples"] > 1 << 15
    assert found["as_recorded"]["verdict"] == "differ"
    assert found["needed"]["more_field_s"] == found["needed"]["more_field_samples"] / 1e6
    assert found["needed"]["shows"] == "match"
    assert "would show a match" in found["statement"]
    assert found["looks_like"] == []
    assert found["spectrum"]["field_occupied_hz"] == pytest.approx(247_500, rel=0.02)


def test_records_may_be_compared_as_they_stand(written):
    """Then nothing is left to chance: two short records of one process are different records."""
    sides = written("one"), written("two")
    found = match(*sides, MatchSettings(looks=False, is_of_records=True))
    assert found["verdict"] == "differ"
    assert found["statement"].startswith("differ: as recorded, one.cf32_le stands")
    assert found["needed"] is None
    assert all(row["low_db"] == row["high_db"] == row["difference_db"] for row in found["levels"])
    assert found["as_recorded"]["difference_db"] == found["decisive"]["difference_db"]
    same = match(sides[0], sides[0], MatchSettings(looks=False, is_of_records=True))
    assert same["verdict"] == "match"
    process = match(*sides, PLAIN)
    assert process["verdict"] == "undecided"
    assert process["compares"] != found["compares"]
    assert process["statement"].startswith("undecided: as recorded one.cf32_le stands")


def test_off_times_compared_as_if_they_were_signal_are_told_of(written, noise):
    gated = noise(1 << 15)
    gated.reshape(8, -1)[:, 1024:] *= 1e-3
    found = match(written("gated", gated), written("steady"), PLAIN)
    told = [row["text"] for row in found["warnings"] if row["where"] == "comparison"]
    assert any("gated.cf32_le is on for 25 % of the time" in text for text in told)
    assert not any("steady.cf32_le is on" in text for text in told)


def test_means_are_compared_where_both_are_absolute(written, noise):
    samples = noise(1 << 15)
    found = match(
        written("one", samples, level_dbm=-10.0),
        written("two", samples / 2, level_dbm=-10.0),
        PLAIN,
    )
    mean = found["mean_difference"]
    assert mean["difference_db"] == pytest.approx(6.02, abs=0.01)
    assert mean["low_db"] < 6 < mean["high_db"]
    assert match(written("one"), written("two"), PLAIN)["mean_difference"] is None


def test_a_capture_too_narrow_for_the_stimulus_is_refused(written):
    with pytest.raises(SignalError) as caught:
        match(written("stimulus"), written("field", rate_hz=200_000), PLAIN)
    assert caught.value.where == "field.cf32_le"


def test_fill_words_decide(written, noise):
    filled = noise(1 << 14) / 1000
    filled[0] = 1 + 1j
    found = match(written("filled", filled), written("clean", filled[1:]), PLAIN)
    assert found["verdict"] == "differ"
    assert "fill words" in found["statement"]
    assert any("fill" in row["text"] for row in found["warnings"])


def test_what_the_field_looks_like(written, noise):
    found = match(written("one"), written("two", noise(1 << 16)))
    first = found["looks_like"][0]
    assert first["law"] == "complex Gaussian"
    assert first["is_near"]
    assert "kind: noise" in first["recipe"]
    assert "bandwidth: 24" in first["recipe"]  # a quarter of 1 MHz, 99 % of it
