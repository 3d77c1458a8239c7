from dataclasses import replace

import numpy as np
import pytest

from wavegen.comparison.off_times import off_time_doubts, share_of_time_on
from wavegen.dsp.bursts import Bursts


@pytest.fixture
def gated(side, noise):
    on = np.repeat([1.0, 1e-3, 1e-3, 1e-3], 1 << 12).astype(np.float32)
    return side(noise(1 << 14) * on, "gated", loops=False)


@pytest.fixture
def steady(side, noise):
    return side(noise(1 << 14), "steady", loops=False)


def test_the_share_is_seen_where_nobody_gated(gated, steady):
    assert share_of_time_on(gated) == pytest.approx(0.25, abs=0.01)
    assert share_of_time_on(steady) is None
    assert share_of_time_on(replace(gated, duty=0.25)) is None
    assert share_of_time_on(replace(gated, signal=None)) is None


def test_off_times_are_told_of(gated, steady):
    assert off_time_doubts((steady, steady)) == []
    (text,) = off_time_doubts((steady, gated))
    assert text.startswith("gated is on for 25 % of the time only")
    (text,) = off_time_doubts((steady, replace(gated, duty=0.25)))
    assert text == "of gated the on-time is compared (25 % of the time), of steady all of the time"
    assert off_time_doubts((replace(gated, duty=0.25), replace(gated, duty=0.25))) == []


def test_few_bursts_are_told_of(gated):
    def of_bursts(count, **settings):
        runs = tuple((200 * k, 200 * k + 100) for k in range(count))
        bursts = Bursts(period_samples=1 << 14, runs=runs)
        return replace(gated, duty=0.25, bursts=bursts, **settings)

    (text,) = off_time_doubts((of_bursts(3), of_bursts(10)))
    assert text.startswith("the stimulus holds 3 bursts only")
    assert off_time_doubts((of_bursts(3, loops=True), of_bursts(10))) == []
