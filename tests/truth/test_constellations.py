"""Constellations against their standards; where each number comes from is in README.md."""

import numpy as np
import pytest

from wavegen.sources.mapping.constellation import Constellation

SQUARE = {16: 4, 64: 6, 256: 8, 1024: 10, 4096: 12}


def made(name):
    return Constellation.parse(name).points


@pytest.mark.parametrize("order", SQUARE)
def test_square_qam_peak_over_mean(order):
    root = np.sqrt(order)
    peak = np.max(np.abs(made(f"{order}qam")) ** 2)
    assert peak == pytest.approx(3 * (root - 1) / (root + 1), rel=1e-12)  # closed form


@pytest.mark.parametrize(
    ("name", "fourth"),
    [  # E|a|^4, sums over the definition
        ("bpsk", 1.0),
        ("qpsk", 1.0),
        ("8psk", 1.0),
        ("16qam", 1.32),
        ("64qam", 1.38095),
        ("256qam", 1.39529),
        ("1024qam", 1.39883),
        ("4096qam", 1.39971),
        ("32qam", 1.31),
        ("128qam", 1.34265),
    ],
)
def test_fourth_moments(name, fourth):
    assert np.mean(np.abs(made(name)) ** 4) == pytest.approx(fourth, abs=6e-6)  # five decimals


@pytest.mark.parametrize("order", SQUARE)
def test_square_qam_fourth_moment_closed_form(order):
    # E a^4 over odd integers below 2^m, both axes: (7M - 13) / (5(M - 1))
    got = np.mean(np.abs(made(f"{order}qam")) ** 4)
    assert got == pytest.approx((7 * order - 13) / (5 * (order - 1)), rel=1e-12)


@pytest.mark.parametrize(
    ("name", "divisor", "zeros", "ones"),
    [  # TS 38.211 cl. 5.1.4 to 5.1.7, the nesting continued for 4096QAM
        ("qpsk", 2, 1, -1),
        ("16qam", 10, 1, -3),
        ("64qam", 42, 3, -7),
        ("256qam", 170, 5, -15),
        ("1024qam", 682, 11, -31),
        ("4096qam", 2730, 21, -63),
    ],
)
def test_all_zero_and_all_one_words(name, divisor, zeros, ones):
    points = made(name) * np.sqrt(divisor)
    assert points[0] == pytest.approx(zeros * (1 + 1j), abs=1e-12)
    assert points[-1] == pytest.approx(ones * (1 + 1j), abs=1e-12)


@pytest.mark.parametrize(
    ("name", "labels"),
    [  # axis labels from the lowest level up, TS 38.211 cl. 5.1
        ("16qam", "11 10 00 01"),
        ("64qam", "111 110 100 101 001 000 010 011"),
        (
            "256qam",
            "1111 1110 1100 1101 1001 1000 1010 1011 0011 0010 0000 0001 0101 0100 0110 0111",
        ),
    ],
)
def test_axis_labels_of_ts_38_211(name, labels):
    points = made(name)
    width = (points.size - 1).bit_length()
    for axis, offset in ((points.real, 0), (points.imag, 1)):
        seen = {}
        for number, level in enumerate(axis.round(9)):
            seen.setdefault(level, set()).add(f"{number:0{width}b}"[offset::2])
        assert [sorted(seen[level]) for level in sorted(seen)] == [[x] for x in labels.split()]


@pytest.mark.parametrize("order", SQUARE)
def test_square_qam_is_gray_on_each_axis(order):
    points = made(f"{order}qam")
    unit = np.min(np.abs(points.real))
    by_place = {(round(p.real / unit), round(p.imag / unit)): n for n, p in enumerate(points)}
    for (x, y), number in by_place.items():
        for neighbour in ((x + 2, y), (x, y + 2)):
            if neighbour in by_place:
                assert (number ^ by_place[neighbour]).bit_count() == 1


@pytest.mark.parametrize(("order", "db"), [(32, 2.3045), (128, 3.1664), (512, 3.5886)])
def test_cross_qam_peak_over_mean(order, db):
    peak = np.max(np.abs(made(f"{order}qam")) ** 2)
    assert 10 * np.log10(peak) == pytest.approx(db, abs=6e-5)  # four decimals, definition


def test_bpsk_word():
    assert made("bpsk") == pytest.approx(np.array([1 + 1j, -1 - 1j]) / np.sqrt(2))  # cl. 5.1.2


def test_8psk_labels():
    degrees = np.degrees(np.angle(made("8psk"))) % 360  # EN 302 307-1 cl. 5.4.2
    assert degrees == pytest.approx([45, 0, 180, 225, 90, 315, 135, 270], abs=1e-9)
