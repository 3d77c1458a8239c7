"""The signal of constant envelope: any range of it by itself."""

import pickle
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.phase_modulation import PhaseModulation
from wavegen.sources.phase_signal import CELL_SAMPLES, cell_of

RATE = Fraction(2_500_000)
FORMS = {  # symbol rate at 2.5 MHz: whole symbols, places by number, places between
    "whole": Fraction(312_500),
    "places": Fraction(1_625_000, 6),
    "between": Fraction(271_828),
}
SCHEMES = (
    {"scheme": "gmsk", "bt": 0.3},
    {"scheme": "gfsk", "bt": 0.5, "h": Fraction(63, 200), "levels": 4},
    {"scheme": "four_level_fm"},
    {"scheme": "soqpsk_tg"},
)


def carrier(form, fields, n_samples=60_000):
    made = PhaseModulation(symbol_rate_hz=FORMS[form], **fields)
    cycle = made.cycle(RATE, "signal").n_samples
    n = -(-n_samples // cycle) * cycle
    return made.build(Site(sample_rate_hz=RATE, n_samples=n, seed=4, label="x", path="signal"))


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("fields", SCHEMES, ids=str)
def test_same_bits_under_random_cuts_and_across_the_seam(form, fields):
    signal = carrier(form, fields)
    whole = samples_of(signal)
    n = signal.n_samples
    rng = np.random.default_rng(11)
    cuts = [(int(low), int(low + size)) for low, size in rng.integers(1, 40_000, (8, 2))]
    for start, stop in [*cuts, (-5, 7), (n - 1, n + 1), (3 * n - 9, 3 * n + 9)]:
        got = samples_of(signal, start, stop)
        assert got.tobytes() == whole[np.arange(start, stop) % n].tobytes()


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("fields", SCHEMES, ids=str)
def test_samples_are_those_of_the_definition(form, fields):
    # float64 sums over three periods of symbols, so that the middle one starts in mid flight
    signal = carrier(form, fields, n_samples=3000)
    a, b = signal.ratio
    count = 2000
    start = signal.n_samples - count // 2  # across the seam
    t = np.arange(start, start + count) * (b / a)
    first, last = int(t[0]) - 80, int(t[-1]) + 80
    numbers = signal.symbols.range(first, last - first)
    turns = np.zeros(count)
    for i, level in zip(range(first, last), signal.symbols.levels(numbers), strict=True):
        turns += float(signal.index) * level * signal.pulse.values(t - i)
    got = samples_of(signal, start, start + count).astype(complex)
    turned = got * np.exp(-2j * np.pi * turns)
    # float32 angle, sine and parts 3e-7; interpolation 5e-8 rad
    assert np.max(np.abs(turned - turned[0])) < 7e-7


def test_a_pickle_is_small():
    signal = carrier("places", SCHEMES[0])
    samples_of(signal, 0, 100)
    assert len(pickle.dumps(signal)) < 5000


def test_memory_of_a_long_loop_is_one_integer_a_block():
    # 10^7 samples: 8e5 symbols, 50 blocks
    signal = carrier("whole", SCHEMES[0], n_samples=10_000_000)
    assert signal.symbols.sums.size == -(-signal.symbols.period // (1 << 14))
    far = samples_of(signal, 9_000_000, 9_000_100)
    assert np.abs(far) == pytest.approx(1.0, abs=1e-6)


@pytest.mark.parametrize("a", [1, 7, 120, 5000, 16_384, 16_385, 10**6])
def test_cells_are_whole_cycles_where_these_are_short(a):
    cell = cell_of(a)
    assert cell <= CELL_SAMPLES
    assert cell % a == 0 or (a > CELL_SAMPLES and cell == CELL_SAMPLES)
