import numpy as np
import pytest

from wavegen.sources.ofdm_layout import Layout
from wavegen.sources.ofdm_power import Part, half_turn, mean_power
from wavegen.sources.ofdm_schedule import Presence


def part(expected, *, variance: float = 0.0, on=(True,)) -> Part:
    expected = np.asarray(expected, np.complex128)
    return Part(
        key="groups[0]",
        indices=np.arange(expected.size) - expected.size // 2,
        expected=expected,
        variance=variance,
        presence=Presence(on=np.array(on)),
    )


def realised(layout: Layout, parts: list[Part], *, is_shifted: bool, n_symbols: int) -> float:
    """Mean power of what is expected, laid symbol by symbol; random parts have none here."""
    n, w = layout.n_fft, layout.rising
    bodies = []
    for k in range(n_symbols):
        grid = np.zeros(n, complex)
        for each in parts:
            if each.presence.on[k % each.presence.on.size]:
                grid[each.indices] = each.expected
        bodies.append(grid)
    samples = []
    shift = 0.5 if is_shifted else 0.0
    for k in range(n_symbols):
        prefix = layout.prefixes[k % layout.n_symbols]
        tones = np.arange(n)[:, None] + shift

        def at(grid, times, tones=tones):
            return grid @ np.exp(2j * np.pi / n * tones * times)

        symbol = at(bodies[k], np.arange(-prefix, n))
        before = at(bodies[k - 1], n + np.arange(layout.edge))
        symbol[: layout.edge] = w * symbol[: layout.edge] + (1 - w) * before
        samples.append(symbol)
    return float(np.mean(np.abs(np.concatenate(samples)) ** 2))


def test_random_data_alone() -> None:
    layout = Layout(n_fft=64, prefixes=(16, 20), edge=8)
    # Raised cosine: the mean of w^2 + (1 - w)^2 is 3/4 over each edge of 8 samples.
    expected = 2.5 * (164 - 2 * 8 / 4) / 164
    assert np.isclose(mean_power(layout, [part([0] * 5, variance=2.5)]), expected, rtol=1e-12)


def test_random_data_with_a_schedule() -> None:
    # On in two of three symbols: their bodies and prefixes less the edges count in full; each
    # edge has 3/8 of its length from the symbol that rises and 3/8 from the one that falls.
    layout = Layout(n_fft=64, prefixes=(16,), edge=8)
    on = (True, False, True)
    expected = 2.5 * 2 * (80 - 8 + 2 * 8 * 3 / 8) / (3 * 80)
    assert np.isclose(mean_power(layout, [part([0] * 5, variance=2.5, on=on)]), expected)


@pytest.mark.parametrize("is_shifted", [False, True])
@pytest.mark.parametrize("edge", [0, 4])
def test_fixed_values_have_the_power_of_their_samples(is_shifted, edge) -> None:
    rng = np.random.default_rng(20)
    layout = Layout(n_fft=16, prefixes=(5, 7), edge=edge)
    on = ((True, False, True, False, False), (False, True, True, False, True))
    parts = [part(rng.normal(size=6) + 1j * rng.normal(size=6), on=x) for x in on]
    object.__setattr__(parts[1], "indices", parts[1].indices + 7)
    expected = realised(layout, parts, is_shifted=is_shifted, n_symbols=10)
    found = mean_power(layout, parts, is_shifted=is_shifted)
    assert np.isclose(found, expected, rtol=1e-12)
    if edge:  # the shift shows, where symbols overlap
        assert not np.isclose(mean_power(layout, parts, is_shifted=not is_shifted), expected)


def test_mean_power_of_a_symbol() -> None:
    on = (True, False, False, True, False)
    assert part([3, 4j], variance=5.0, on=on).mean_power == pytest.approx(30 * 2 / 5)


def test_half_a_turn() -> None:
    assert np.allclose(half_turn(4), np.exp(1j * np.pi / 4) ** np.arange(4))
