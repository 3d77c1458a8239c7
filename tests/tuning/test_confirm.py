"""Settings on other data, and what is said of them."""

from contextlib import contextmanager
from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.meters.batches import measure_batches
from wavegen.tuning.confirm import Interval, confirm
from wavegen.tuning.limits import Limits

LIMITS = Limits(evm_percent=8.0)


def fresh_of(made, percents, same=None):
    """Loops of Gaussian noise with given EVM."""

    @contextmanager
    def fresh(seed):
        def repeat(_found, _stage):
            rng = np.random.default_rng(seed)
            noise = (rng.standard_normal(4096) + 1j * rng.standard_normal(4096)) / np.sqrt(2)
            power = measure_batches(noise.astype(np.complex64), loops=True)
            got = same or made.evaluation(percent=percents[seed - 6], ratio_db=50.0 - seed)
            return got, SimpleNamespace(power=power)

        yield SimpleNamespace(repeat=repeat)

    return fresh


def confirmed(made, percents, **more):
    return confirm(
        made.evaluation(),
        None,
        fresh=fresh_of(made, percents, **more),
        limits=LIMITS,
        seed=5,
        probability=1e-2,
    )


@pytest.mark.parametrize(
    ("percents", "verdict"),
    [
        ((7.5, 7.6, 7.4, 7.5), "confirmed"),
        ((8.5, 8.6, 8.4, 8.5), "missed"),
        ((7.5, 8.6, 7.4, 8.3), "undecided"),
    ],
)
def test_verdicts(made, percents, verdict):
    found = confirmed(made, percents)
    assert found.verdict == verdict
    assert found.seeds == (6, 7, 8, 9)
    assert found.evm_percent.mean == pytest.approx(np.mean(percents))
    assert found.aclr_db == 41.0
    assert (found.shortage_db > 0) == (verdict != "confirmed")


def test_the_level_is_that_of_all_loops_together(made):
    found = confirmed(made, (7.5,) * 4)
    # of a complex Gaussian 1 % lies 6.63 dB over the mean; 164 samples beyond
    assert found.level_db.low < 6.63 < found.level_db.high
    assert found.level_db.high - found.level_db.low < 0.8


def test_a_signal_that_the_seed_does_not_touch(made):
    found = confirmed(made, (), same=made.evaluation())
    assert found.verdict == "no_other_data"
    assert found.seeds == (6,)
    assert found.row()["evm_percent"]["low"] is None


def test_the_interval_of_a_mean():
    # Student, 95 %, 3 degrees: 3.1824; standard error 1 / sqrt(4) * sqrt(5 / 3)
    found = Interval.of([1.0, 2.0, 3.0, 4.0])
    assert found.mean == 2.5
    assert found.high - found.mean == pytest.approx(3.18245 * np.sqrt(5 / 3) / 2, rel=1e-5)


def test_it_holds_in_95_of_100():
    rng = np.random.default_rng(3)
    inside = [abs_low_high(rng.standard_normal(4)) for _ in range(2000)]
    assert np.mean(inside) == pytest.approx(0.95, abs=3 * np.sqrt(0.95 * 0.05 / 2000))


def abs_low_high(values):
    found = Interval.of(list(values))
    return found.low <= 0 <= found.high
