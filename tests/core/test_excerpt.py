import numpy as np
import pytest

from wavegen.core.excerpt import excerpt
from wavegen.core.render import samples_of


@pytest.mark.parametrize(("first", "stop"), [(0, 10), (7, 100), (99, 100), (90, 310)])
def test_the_samples_are_those_of_the_stretch(lab, first, stop):
    source = lab.entangled(100)
    part = excerpt(source, first, stop)
    whole = samples_of(source, 0, 400)
    assert part.n_samples == stop - first
    assert part.sample_rate_hz == source.sample_rate_hz
    assert np.array_equal(samples_of(part), whole[first:stop])
    assert np.array_equal(samples_of(part, 3, 8), np.tile(whole[first:stop], 9)[3:8])


def test_all_of_a_signal_is_the_signal(lab):
    source = lab.white(100)
    assert excerpt(source, 0, 100) is source
    assert excerpt(source, 0, 99).mean_power is None


def test_the_input_is_left_alone(lab):
    source = lab.white(100)
    given = source.compute(0, 100)
    part = excerpt(source, 0, 50)
    got = part.compute(0, 50, given[:50])
    got[:] = 0
    assert np.array_equal(given, source.compute(0, 100))
