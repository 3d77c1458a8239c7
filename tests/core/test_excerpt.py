import numpy as np
import pytest

from wavegen.core.excerpt import excerpt, padded
from wavegen.core.render import samples_of


@pytest.mark.parametrize(("first", "stop"), [(0, 300), (123, 124), (700, 1_000), (900, 2_500)])
def test_is_the_stretch_counted_from_zero(lab, first, stop):
    source = lab.white(1_000)
    cut = excerpt(source, first, stop)
    want = lab.direct_white(1_000)[np.arange(first, stop) % 1_000]
    assert (cut.n_samples, cut.sample_rate_hz) == (stop - first, lab.rate_hz)
    assert samples_of(cut).tobytes() == want.tobytes()


def test_repeats_with_its_own_length(lab):
    cut = excerpt(lab.white(1_000), 10, 17)
    around = samples_of(cut, -7, 14)
    assert around.tobytes() == samples_of(cut).tobytes() * 3


def test_its_mean_is_not_that_of_the_whole(lab):
    assert excerpt(lab.white(1_000), 0, 999).mean_power is None


def test_all_of_it_is_the_signal_itself(lab):
    source = lab.white(1_000)
    assert excerpt(source, 0, 1_000) is source


def test_the_source_is_left_alone(lab):
    source = lab.white(100)
    cut = excerpt(source, 5, 50)
    array = samples_of(source, 5, 50)
    array.flags.writeable = False
    got = cut.compute(0, 45, array)
    got[:] = 0
    assert array.tobytes() == samples_of(cut).tobytes()


def test_zeros_stand_after_the_end_and_before_the_start(lab):
    source = lab.white(1_000)
    longer = padded(source, 1_300)
    want = np.concatenate([lab.direct_white(1_000)[np.arange(1_000)], np.zeros(300, np.complex64)])
    assert longer.n_samples == 1_300
    assert samples_of(longer).tobytes() == want.tobytes()
    assert samples_of(longer, -200, 100).tobytes() == np.roll(want, 200)[:300].tobytes()
    assert samples_of(longer, 1_100, 1_200).tobytes() == bytes(800)
