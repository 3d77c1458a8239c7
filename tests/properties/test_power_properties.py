"""What must hold of power statistics whatever the samples and however they are cut."""

from itertools import pairwise

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from wavegen.meters.mean import MeanMeter
from wavegen.meters.power import PowerMeter, measure_samples

PARTS = st.floats(width=32, allow_nan=False, allow_infinity=False)
ANY_SAMPLES = hnp.arrays(np.float32, st.integers(1, 60).map(lambda n: (n, 2)), elements=PARTS).map(
    lambda parts: parts.view(np.complex64)[:, 0]
)
NONZERO = ANY_SAMPLES.filter(lambda samples: bool(np.any(samples)))


@st.composite
def long_samples(draw):
    """Several cells of noise, some of it silent, some at another scale."""
    seed = draw(st.integers(0, 2**32 - 1))
    n = draw(st.integers(1, 6000))
    rng = np.random.default_rng(seed)
    noise = (rng.standard_normal(n) + 1j * rng.standard_normal(n)).astype(np.complex64)
    samples = noise.copy()
    for _ in range(draw(st.integers(0, 3))):
        low, high = sorted(draw(st.tuples(st.integers(0, n), st.integers(0, n))))
        scale = np.float32(draw(st.sampled_from([0, 1, 1e-25, 1e-13, 1e14, 1e25])))
        samples[low:high] = noise[low:high] * scale
    samples[0] = 1
    return samples


def same(one, other):
    for name in ("n_samples", "n_zeros", "mean", "peak", "peak_index", "least", "start"):
        assert getattr(one, name) == getattr(other, name), name
    for name in ("counts", "edges", "top_powers", "top_counts", "cell_maxima"):
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name), name)


def read(meter, samples, edges):
    """One reading of the stretch from the first edge to the last, fed between the edges."""
    reading = meter.begin(None)
    for start, stop in pairwise(edges):
        reading.feed(start, samples[start:stop])
    return reading


@settings(max_examples=60, deadline=None)
@given(samples=long_samples(), data=st.data())
def test_any_partition_gives_the_same_result(samples, data):
    n = samples.size
    cuts = data.draw(st.lists(st.integers(0, n), max_size=12))
    edges = [0, *sorted(cuts), n]
    whole = measure_samples(samples)
    # Some edges are merges, the others only separate two feeds.
    is_merge = [
        True,
        *data.draw(st.lists(st.booleans(), min_size=len(cuts), max_size=len(cuts))),
        True,
    ]
    merges = [place for place, merged in enumerate(is_merge) if merged]
    for meter in (PowerMeter(), MeanMeter()):
        readings = [read(meter, samples, edges[low : high + 1]) for low, high in pairwise(merges)]
        # Adjacent readings are merged in any order.
        while len(readings) > 1:
            place = data.draw(st.integers(0, len(readings) - 2))
            readings[place].merge(readings.pop(place + 1))
        result = readings[0].result()
        if isinstance(meter, PowerMeter):
            same(result, whole)
        else:
            assert result == whole.mean


@settings(max_examples=100, deadline=None)
@given(samples=NONZERO)
def test_bounds_hold_at_every_scale(samples):
    found = measure_samples(samples)
    power = np.abs(samples.astype(np.complex128)) ** 2
    assert found.n_zeros == np.count_nonzero(samples == 0)
    assert found.counts.sum() == samples.size - found.n_zeros
    assert found.counts[0] > 0
    assert found.counts[-1] == found.top_counts.sum() > 0
    # Three float32 roundings a sample: 2^-22 is more than they make.
    np.testing.assert_allclose(found.mean, power.mean(), rtol=2.0**-22)
    np.testing.assert_allclose(found.peak, power.max(), rtol=2.0**-22)
    np.testing.assert_allclose(found.least, power[power > 0].min(), rtol=2.0**-22)
    assert found.papr_db >= -1e-9
    assert found.papr_db <= 10 * np.log10(samples.size) + 1e-6


@settings(max_examples=100, deadline=None)
@given(samples=NONZERO, levels=st.lists(st.floats(-300, 60), min_size=2, max_size=20))
def test_ccdf_falls_from_at_most_one_to_zero(samples, levels):
    found = measure_samples(samples)
    grid = np.sort(levels)
    ccdf = found.ccdf(grid)
    assert np.all(np.diff(ccdf) <= 0)
    assert np.all((ccdf >= 0) & (ccdf <= 1))
    assert found.ccdf(found.papr_db + 1e-6) == 0
    assert found.ccdf(-np.inf) == (found.n_samples - found.n_zeros) / found.n_samples


@settings(max_examples=100, deadline=None)
@given(samples=NONZERO, asked=st.lists(st.floats(0, 1), min_size=2, max_size=20))
def test_level_falls_with_probability_and_keeps_its_promise(samples, asked):
    found = measure_samples(samples)
    probability = np.sort(asked)
    power = found.level_power(probability)
    assert np.all(np.diff(power) <= 0)
    assert np.all(power <= found.peak)
    beyond = found.exceedances_of_power(power * (1 + 1e-12))
    assert np.all(beyond <= probability * samples.size + 1e-6)


@settings(max_examples=60, deadline=None)
@given(samples=long_samples(), exponent=st.integers(-30, 30))
def test_a_power_of_two_scales_exactly(samples, exponent):
    ordinary = np.where(np.abs(samples) > 1e10, 1, samples).astype(np.complex64)
    ordinary[np.abs(ordinary) < 1e-10] = 0
    one = measure_samples(ordinary)
    other = measure_samples(ordinary * np.float32(2.0**exponent))
    np.testing.assert_array_equal(one.counts, other.counts)
    np.testing.assert_array_equal(one.edges * 4.0**exponent, other.edges)
    assert other.mean == one.mean * 4.0**exponent
    assert other.papr_db == one.papr_db


@settings(max_examples=40, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), n=st.integers(2, 4000))
def test_powers_of_parts_on_different_rails_add(seed, n):
    rng = np.random.default_rng(seed)
    real, imag = rng.standard_normal((2, n)).astype(np.float32)
    both = measure_samples((real + 1j * imag).astype(np.complex64))
    apart = [measure_samples(part.astype(np.complex64)).mean for part in (real, 1j * imag)]
    np.testing.assert_allclose(both.mean, sum(apart), rtol=1e-6)


@settings(max_examples=40, deadline=None)
@given(samples=NONZERO, seed=st.integers(0, 2**32 - 1))
def test_order_and_phase_do_not_matter(samples, seed):
    rng = np.random.default_rng(seed)
    turned = rng.permutation(samples) * rng.choice(np.array([1, 1j, -1, -1j], np.complex64))
    one, other = measure_samples(samples), measure_samples(turned.astype(np.complex64))
    np.testing.assert_array_equal(one.counts, other.counts)
    np.testing.assert_array_equal(one.top_powers, other.top_powers)
    assert (one.peak, one.least, one.n_zeros) == (other.peak, other.least, other.n_zeros)
