from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.population import check_same_rate, merged, populate
from wavegen.meters.power import measure_samples


@pytest.fixture
def parts(band_noise):
    first = band_noise(1, 7000, 0.5)
    second = band_noise(2, 3000, 0.5) * np.float32(1.7)
    third = band_noise(3, 500, 0.5) * np.float32(0.01)
    third[:20] = 0
    return [first, second, third]


def test_it_is_as_if_measured_as_one(parts):
    got = merged([measure_samples(part) for part in parts])
    want = measure_samples(np.concatenate(parts))
    for name in ("n_samples", "n_zeros", "peak", "peak_index", "least"):
        assert getattr(got, name) == getattr(want, name)
    assert got.mean == pytest.approx(want.mean, rel=1e-13)
    assert got.counts.tolist() == want.counts.tolist()
    assert got.edges.tolist() == want.edges.tolist()
    assert got.top_powers.tolist() == want.top_powers.tolist()
    assert got.top_counts.tolist() == want.top_counts.tolist()
    probability = [0.1, 0.01, 1e-3, 0]
    assert got.level_db(probability) == pytest.approx(want.level_db(probability), abs=1e-9)


def test_tops_of_equal_height_add_up():
    ones = measure_samples(np.ones(10, np.complex64))
    both = merged([ones, measure_samples(np.array([1, 1, 0.5], np.complex64)), ones])
    assert both.top_powers.tolist() == [1.0]
    assert both.top_counts.tolist() == [22]


def test_order_changes_no_figure(parts):
    statistics = [measure_samples(part) for part in parts]
    one, other = merged(statistics), merged(statistics[::-1])
    assert one.mean == other.mean
    assert one.counts.tolist() == other.counts.tolist()


def test_one_file_is_itself(parts):
    alone = measure_samples(parts[0])
    assert merged([alone]) is alone


def test_members_and_warnings(parts):
    population = populate([(f"f{k}", measure_samples(part)) for k, part in enumerate(parts)])
    assert [member.name for member in population.members] == ["f0", "f1", "f2"]
    assert [member.n_samples for member in population.members] == [7000, 3000, 500]
    assert population.spread_db == pytest.approx(20 * np.log10(170), abs=0.3)
    assert "mixture" in population.warnings[0]
    same = populate([("a", measure_samples(parts[0])), ("b", measure_samples(parts[0]))])
    assert same.warnings == ()
    assert same.statistics.papr_db == pytest.approx(measure_samples(parts[0]).papr_db)


def test_rates_must_agree():
    check_same_rate([Fraction(5), Fraction(5)], ["a", "b"])
    with pytest.raises(ArgumentsError) as caught:
        check_same_rate([Fraction(5), Fraction(5), Fraction(6)], ["a", "b", "c"])
    assert caught.value.where == "c"


def test_no_file_is_told():
    with pytest.raises(ArgumentsError):
        merged([])
