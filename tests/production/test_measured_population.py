from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.core.render import samples_of
from wavegen.production.measure import measure
from wavegen.production.measured_population import reconciled
from wavegen.production.subject import Subject


@pytest.fixture
def pair(lab):
    return [Subject(name=name, signal=lab.held(lab.NOISE), loops=False) for name in ("one", "two")]


def test_one_is_left_alone(pair):
    assert reconciled(pair[:1]) == (pair[0],)


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"is_power": True}, "power alone"),
        ({"reference_level_dbm": 3.0}, "--reference-level"),
    ],
)
@pytest.mark.parametrize("first", [0, 1])
def test_files_that_cannot_be_compared(pair, change, word, first):
    pair[first] = replace(pair[first], **change)
    with pytest.raises(ArgumentsError) as caught:
        reconciled(pair)
    assert word in str(caught.value)


def test_other_rates_are_refused(pair):
    signal = replace(pair[1].signal, sample_rate_hz=Fraction(3))
    with pytest.raises(ArgumentsError) as caught:
        reconciled([pair[0], replace(pair[1], signal=signal)])
    assert caught.value.where == "two"


def test_other_references_are_brought_to_that_of_the_first(pair):
    pair = [
        replace(item, reference_level_dbm=level)
        for item, level in zip(pair, (0.0, 6.0), strict=True)
    ]
    first, second = reconciled(pair)
    assert first is pair[0]
    ratio = samples_of(second.signal, 5, 9) / samples_of(pair[1].signal, 5, 9)
    np.testing.assert_allclose(ratio, 10 ** (6 / 20), rtol=1e-6)
    assert second.reference_level_dbm == 0.0
    assert "scaled" in second.warnings[0]


def test_a_population_has_the_figures_of_all_samples(pair):
    pair[1].signal.samples[:] *= np.float32(0.5)
    document = measure(*pair)
    power = np.abs(np.concatenate([item.signal.samples for item in pair]).astype(complex)) ** 2
    assert document["is"] == "a population of 2 recordings"
    assert document["n_samples"] == power.size
    assert document["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-5)
    assert document["papr_db"] == pytest.approx(10 * np.log10(power.max() / power.mean()), abs=1e-5)
    assert [row["name"] for row in document["files"]] == ["one", "two"]
    assert "differ by 6.02 dB" in document["warnings"][0]["text"]
    # Twice the data: the common mean is the same mixture, and is known no worse.
    assert all(
        row["low_db"] is None or row["low_db"] <= row["level_db"] for row in document["levels"]
    )
    assert document["process"]["n_samples"] == power.size
