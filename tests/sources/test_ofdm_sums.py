import math

import numpy as np
import pytest

from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm_carriers import Carriers
from wavegen.sources.ofdm_sums import as_amplitudes, n_sums, sums_at

QPSK = np.exp(0.5j * np.pi * (np.arange(4) + 0.5))
LEVELS_DB = (-12.0, -3.3, 0.2, 2.2, 4.1, 5.7)


def laid(name, count, first=0, phase=0.0, n_fft=64):
    points = Constellation.parse(name).points
    return Carriers.laid(
        turns=(first + np.arange(count)) / n_fft,
        phases=np.full(count, phase),
        points=points / math.sqrt(np.mean(np.abs(points) ** 2)),
    )


def brute_force(weighed, sample, known=0j):
    total = np.array([known])
    for group, gain in weighed:
        for turn, phase in zip(group.turns, group.phases, strict=True):
            wave = gain * np.exp(1j * (2 * np.pi * turn * sample + phase))
            total = np.add.outer(total, group.points * wave).ravel()
    return np.abs(total)


HIGHEST = 40.0


def tail_of(found):
    return as_amplitudes(found.counted(HIGHEST), HIGHEST)


def above(amplitudes, level_db):
    return np.mean(amplitudes > 10 ** (level_db / 20))


@pytest.mark.parametrize("sample", [0, 5, 16, 32])
@pytest.mark.parametrize("known", [0j, 0.7 - 0.2j])
def test_sums_are_all_sums(sample, known):
    weighed = [(laid("qpsk", 3), 0.8), (laid("bpsk", 2, first=9, phase=0.3), 1.1)]
    found = tail_of(sums_at(weighed, sample, known))
    want = brute_force(weighed, sample, known)
    for level_db in LEVELS_DB:
        got = float(found.above(np.array([10 ** (level_db / 20)]))[0])
        assert got == pytest.approx(above(want, level_db), abs=1e-12)


@pytest.mark.parametrize(
    ("name", "count", "sample"),
    [
        ("16qam", 5, 0),
        ("16qam", 5, 16),
        ("qpsk", 10, 16),
        ("bpsk", 18, 16),
        ("16qam", 5, 8),
        ("8psk", 6, 8),
        ("8psk", 6, 0),
    ],
)
@pytest.mark.parametrize("known", [0j, 0.4 + 0.9j])
def test_rails_of_a_lattice_add_up_apart(name, count, sample, known):
    weighed = [(laid(name, count, phase=0.2), 1.0)]
    found = sums_at(weighed, sample, known)
    assert found.count < n_sums([weighed[0][0]])
    found = tail_of(found)
    want = brute_force(weighed, sample, known)
    for level_db in LEVELS_DB:
        got = float(found.above(np.array([10 ** (level_db / 20)]))[0])
        assert got == pytest.approx(above(want, level_db), abs=1e-9)


@pytest.mark.parametrize(("name", "sample"), [("16qam", 3), ("8psk", 3), ("32qam", 3)])
def test_many_sums_that_are_no_lattice_of_rails(name, sample):
    assert sums_at([(laid(name, 12), 1.0)], sample, 0j) is None


def test_a_lattice_may_have_too_many_points():
    group = laid("64qam", 500)
    assert sums_at([(group, 1.0)], 0, 0j) is None
    assert math.isinf(n_sums([group]))


def test_points_on_a_line_are_laid_on_the_axis():
    group = laid("bpsk", 2)
    assert group.points == pytest.approx([1, -1]) or group.points == pytest.approx([-1, 1])
    assert group.rails is not None
