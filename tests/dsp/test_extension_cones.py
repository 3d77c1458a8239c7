import numpy as np
import pytest

from wavegen.dsp.extension_cones import cones_of, into_cones, into_cones_by_numpy
from wavegen.sources.mapping.constellation import Constellation

NAMES = ["bpsk", "qpsk", "8psk", "16qam", "32qam", "64qam", "16apsk 3/4"]


def moved_at_random(points, seed=1, n=400):
    """Return wanted and allowed moves of each point, shape (n, order)."""
    rng = np.random.default_rng(seed)
    wanted = rng.normal(size=(n, points.size)) + 1j * rng.normal(size=(n, points.size))
    numbers = np.broadcast_to(np.arange(points.size), wanted.shape)
    wanted = wanted.astype(np.complex64)
    return wanted, into_cones(wanted, cones_of(points).of(numbers))


@pytest.mark.parametrize("name", NAMES)
def test_no_two_points_come_nearer(name):
    points = Constellation.parse(name).points
    _, moves = moved_at_random(points)
    before = np.abs(points[:, None] - points[None, :])
    for move in moves[:50].astype(np.complex128):
        after = np.abs((points + move)[:, None] - (points + move)[None, :])
        assert np.min(after - before) > -3e-6  # single precision of moves up to 4


@pytest.mark.parametrize("name", NAMES)
def test_it_is_the_nearest_allowed_move(name):
    """Of a convex cone: what is left is at right angles to it, and nothing allowed lies beyond."""
    points = Constellation.parse(name).points
    wanted, allowed = moved_at_random(points)
    _, others = moved_at_random(points, seed=2)
    left = (wanted - allowed).astype(np.complex128)
    assert np.max(np.abs(np.real(left * np.conj(allowed)))) < 2e-5
    assert np.max(np.real(left * np.conj(others))) < 2e-5


@pytest.mark.parametrize(("name", "n_moving"), [("qpsk", 4), ("16qam", 12), ("64qam", 28)])
def test_outer_points_move_and_inner_ones_do_not(name, n_moving):
    points = Constellation.parse(name).points
    _, moves = moved_at_random(points)
    is_moving = np.any(moves != 0, axis=0)
    edge = np.max(np.abs(points.real))
    outer = (np.abs(points.real) > edge - 1e-9) | (np.abs(points.imag) > edge - 1e-9)
    assert is_moving.sum() == n_moving
    assert np.array_equal(is_moving, outer)


def test_edges_go_straight_out_and_corners_into_a_quarter():
    points = np.array([a + 1j * b for a in (-3, -1, 1, 3) for b in (-3, -1, 1, 3)])
    cones = cones_of(points)
    edge, corner = int(np.argmax(points == 3 + 1j)), int(np.argmax(points == 3 + 3j))
    assert cones.axis[edge] == pytest.approx(1)
    assert (cones.cosine[edge], cones.sine[edge]) == (1, 0)
    assert cones.axis[corner] == pytest.approx((1 + 1j) / np.sqrt(2))
    assert cones.sine[corner] == pytest.approx(np.sqrt(0.5))


@pytest.mark.parametrize("order", [8, 16])
def test_a_point_of_psk_has_a_wedge(order):
    cones = cones_of(np.exp(2j * np.pi * np.arange(order) / order))
    assert np.allclose(cones.axis, np.exp(2j * np.pi * np.arange(order) / order), atol=1e-6)
    assert np.allclose(np.arctan2(cones.sine, cones.cosine), np.pi / order, atol=1e-6)


def test_equal_points_do_not_count():
    cones = cones_of(np.array([1, 1, -1, -1], complex))
    assert np.allclose(cones.axis, [1, 1, -1, -1], atol=1e-6)
    assert np.allclose(cones.sine, 1)
    assert not cones_of(np.array([1, 1], complex)).axis.any()


@pytest.mark.parametrize("name", NAMES)
def test_compiled_loop_and_numpy_give_the_same_bits(name):
    points = Constellation.parse(name).points
    wanted, allowed = moved_at_random(points)
    numbers = np.broadcast_to(np.arange(points.size), wanted.shape)
    cones = cones_of(points).of(numbers)
    assert np.array_equal(into_cones_by_numpy(wanted, cones), allowed)
