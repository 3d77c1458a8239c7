import math

import numpy as np
import pytest

from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm_carriers import (
    Carriers,
    fold_of,
    is_on_a_line,
    mirror_fold,
    same_points,
)

T = np.linspace(0.2, 9, 12)
ANGLE = np.array([0.1, 1.0, 2.5])


def carriers_of(count, n_fft, points, phases=None):
    return Carriers(
        turns=np.arange(count) / n_fft,
        phases=np.zeros(count) if phases is None else np.asarray(phases),
        points=np.asarray(points) / math.sqrt(count * np.mean(np.abs(points) ** 2)),
    )


@pytest.mark.parametrize("name", ["bpsk", "qpsk", "16qam", "8psk", "32qam"])
def test_the_factor_is_the_mean_over_the_points(name):
    points = Constellation.parse(name).points
    carriers = carriers_of(3, 16, points)
    want = np.ones((T.size, ANGLE.size), complex)
    for turn in carriers.turns:
        turned = carriers.points * np.exp(2j * np.pi * turn * 5) * 0.8
        along = np.real(turned[:, None] * np.exp(-1j * ANGLE))
        want *= np.exp(1j * np.multiply.outer(T, along)).mean(axis=1)
    assert carriers.factor(T, ANGLE, 5.0, 0.8) == pytest.approx(want, abs=1e-13)


def test_points_without_opposites():
    carriers = carriers_of(2, 16, [1, -0.5 + 0.5j, -0.5 - 0.5j])
    value = carriers.factor(T, ANGLE, 1.0, 1.0)
    assert np.abs(value.imag).max() > 0.01
    assert same_points(carriers.points, carriers.points[::-1])
    assert not same_points(carriers.points, -carriers.points)


@pytest.mark.parametrize(
    ("name", "fold"), [("bpsk", 2), ("qpsk", 4), ("8psk", 4), ("16qam", 4), ("32qam", 4)]
)
def test_folds(name, fold):
    group = carriers_of(3, 16, Constellation.parse(name).points)
    assert fold_of([group]) == fold
    odd = carriers_of(2, 16, [1, -0.5 + 0.5j, -0.5 - 0.5j])
    assert fold_of([group, odd]) == 1
    tilted = carriers_of(3, 16, Constellation.parse("qpsk").points, phases=[0.0, 0.2, 0.1])
    assert mirror_fold([tilted]) == 0
    assert mirror_fold([carriers_of(3, 16, Constellation.parse("qpsk").points)]) == 4


@pytest.mark.parametrize(("name", "flat"), [("bpsk", True), ("qpsk", False), ("8psk", False)])
def test_points_on_a_line_are_laid_on_the_axis(name, flat):
    points = Constellation.parse(name).points
    assert is_on_a_line(points) is flat
    turns, phases = np.arange(3) / 16, np.array([0.0, 0.3, 0.0])
    group = Carriers.laid(turns=turns, phases=phases, points=points)
    assert bool(np.abs(group.points.imag).max() < 1e-12) is flat
    plain = Carriers(turns=turns, phases=phases, points=points)
    assert group.factor(T, ANGLE, 5.0, 0.8) == pytest.approx(
        plain.factor(T, ANGLE, 5.0, 0.8), abs=1e-13
    )
