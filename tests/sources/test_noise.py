from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.noise import Noise

RATE = Fraction(1_000_000)


def site(n: int, seed: int = 1, label: str = "a") -> Site:
    return Site(sample_rate_hz=RATE, n_samples=n, seed=seed, label=label, path="signal")


@pytest.mark.parametrize("bandwidth", [RATE, Fraction(200_000), Fraction(9_000)])
@pytest.mark.parametrize("n", [40_009, 501, 3])
def test_bits_do_not_depend_on_the_cut(bandwidth, n):
    signal = Noise(bandwidth_hz=bandwidth).build(site(n))
    whole = samples_of(signal)
    rng = np.random.default_rng(2)
    for _ in range(8):
        start = int(rng.integers(-2 * n, 2 * n))
        count = int(rng.integers(1, 2 * n))
        got = evaluate({signal: (start, start + count)})[signal]
        expected = whole.take(np.arange(start, start + count), mode="wrap")
        np.testing.assert_array_equal(got.view(np.uint32), expected.view(np.uint32))


def test_seed_and_label_name_the_samples():
    def made(**who):
        return samples_of(Noise(bandwidth_hz=Fraction(100_000)).build(site(500, **who)))

    np.testing.assert_array_equal(made(), made())
    assert not np.array_equal(made(), made(seed=2))
    assert not np.array_equal(made(), made(label="b"))


@pytest.mark.parametrize("n", [5, 100, 1000])
def test_power_of_a_loop_shorter_than_the_filter_is_one_over_seeds(n):
    seeds = 2000 // n + 40
    signal = Noise(bandwidth_hz=Fraction(100_000))
    mean = [np.mean(np.abs(samples_of(signal.build(site(n, seed)))) ** 2) for seed in range(seeds)]
    # Each seed's mean averages about n/10 + 1 independent exponentials; 4 sigma.
    assert abs(np.mean(mean) - 1) < 4 / np.sqrt(seeds * max(1, n / 10))


def test_noise_wider_than_the_sample_rate_is_refused():
    for bandwidth, edge in [(Fraction(990_000), None), (Fraction(2_000_000), 0.01)]:
        with pytest.raises(RecipeError) as caught:
            Noise(bandwidth_hz=bandwidth, edge_fraction=edge).build(site(100))
        assert caught.value.where == "signal.bandwidth"
        assert "1 MHz" in caught.value.allowed


def test_edges_too_steep_for_a_filter_are_refused():
    with pytest.raises(RecipeError) as caught:
        Noise(bandwidth_hz=Fraction(1_000), edge_fraction=0.01).build(site(100))
    assert caught.value.where == "signal.edge"
    with pytest.raises(RecipeError) as caught:
        Noise(bandwidth_hz=Fraction(20)).build(site(100))
    assert caught.value.where == "signal.bandwidth"


def test_narrow_noise_widens_its_default_edge_and_says_so():
    here = site(100)
    Noise(bandwidth_hz=Fraction(100_000)).build(here)
    assert not here.notes
    Noise(bandwidth_hz=Fraction(100)).build(here)
    assert [note.kind for note in here.notes] == ["info"]
    assert here.notes[0].where == "signal.edge"


def test_any_loop_will_do():
    assert Noise(bandwidth_hz=Fraction(1)).cycle(RATE, "signal").n_samples == 1
    assert Noise(bandwidth_hz=Fraction(1)).law(site(1)).holds == "over seeds"
