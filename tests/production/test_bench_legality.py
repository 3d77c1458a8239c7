"""What a generator takes."""

import pytest

from wavegen.production.bench_legality import legality
from wavegen.recipe.bench import Generator

DOCUMENT = {
    "sample_rate_hz": 100e6,
    "n_samples": 100_000,
    "duration_s": 1e-3,
    "files": [{"bits": None, "datatype": "ci16_le"}],
}


def rows(bits=None, datatype="ci16_le", **limits):
    document = DOCUMENT | {"files": [{"bits": bits, "datatype": datatype}]}
    return {row["what"]: row for row in legality(Generator(**limits), document)}


def test_what_is_not_limited_is_told_and_met():
    found = rows()
    assert set(found) == {"duration", "data"}
    assert found["data"]["value"].startswith("0.4 MB")  # 100 000 samples of 4 bytes
    assert all(row["is_met"] for row in found.values())


def test_two_channels_need_twice_the_memory():
    document = DOCUMENT | {"files": [DOCUMENT["files"][0] | {"channels": [{}, {}]}]}
    (data,) = [row for row in legality(Generator(), document) if row["what"] == "data"]
    assert data["value"].startswith("0.8 MB")


@pytest.mark.parametrize(("least", "most", "is_met"), [(1e6, 2e8, True), (2e8, None, False)])
def test_clock(least, most, is_met):
    assert rows(clock_least_hz=least, clock_most_hz=most)["clock"]["is_met"] is is_met


def test_length_within_the_memory_and_over_the_least():
    assert rows(memory_samples=100_000)["length"]["is_met"]
    assert not rows(memory_samples=99_999)["length"]["is_met"]
    assert not rows(least_samples=100_001)["length"]["is_met"]


def test_legal_lengths_stand_beside_an_illegal_one():
    row = rows(granularity_samples=48)["granularity"]
    # 100000 / 48 = 2083.3: 2083 x 48 = 99984, 2084 x 48 = 100032
    assert not row["is_met"]
    assert "99984 or 100032" in row["allowed"]
    assert rows(granularity_samples=16)["granularity"]["is_met"]


def test_words_shorter_than_the_converter_are_not_met():
    assert rows(word_bits=16)["word"]["is_met"]
    assert not rows(bits=12, word_bits=14)["word"]["is_met"]
    assert not rows(datatype="ci8", word_bits=14)["word"]["is_met"]
