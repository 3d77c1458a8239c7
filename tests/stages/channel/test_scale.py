import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.stages.channel.scale import Scale


@pytest.mark.parametrize("gain_db", [-200.0, -3.0, 6.020599913279624, 200.0])
def test_multiplies_both_rails(bench, gain_db):
    source = bench.given([1 + 2j, -3j, 0, -0.5])
    got = samples_of(Scale(gain_db=gain_db).build(bench.site(4), source))
    # One float32 rounding of the gain and one of each product.
    want = np.array(source.values) * 10 ** (gain_db / 20)
    np.testing.assert_allclose(got, want, rtol=2 * 2**-23, atol=0)
    assert got.dtype == np.complex64


@pytest.mark.parametrize(
    ("before", "gain_db", "after"), [(1.0, 10.0, 10.0), (2.0, -10.0, 0.2), (None, 3.0, None)]
)
def test_the_nominal_mean_power_follows(bench, before, gain_db, after):
    source = bench.given([1], mean_power=before)
    power = Scale(gain_db=gain_db).build(bench.site(1), source).mean_power
    assert power == (None if after is None else pytest.approx(after, rel=1e-12))


def test_no_gain_is_no_stage(bench):
    source = bench.given([1, 2j])
    assert Scale(gain_db=0.0).build(bench.site(2), source) is source


def test_period_and_rate_are_kept(bench):
    signal = Scale(gain_db=1.0).build(bench.site(4097), bench.gaussian(4097))
    assert (signal.n_samples, signal.sample_rate_hz) == (4097, bench.rate_hz)
