import math
from fractions import Fraction

import numpy as np
import pytest
import scipy.special

from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.ofdm_parts import Group, Pilots
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

SPACING = Fraction(15000)
T = np.linspace(0, 9, 30)


def ofdm(*, edge="8 samples", pilots=True, **more):
    return Ofdm(
        subcarrier_spacing_hz=SPACING,
        groups=(
            Group(
                subcarriers=IndexSet.parse("-50..-1"),
                constellation=Constellation.parse("16qam"),
                symbols=SymbolSet.parse("0, 2"),
            ),
            Group(
                subcarriers=IndexSet.parse("1..60"),
                constellation=Constellation.parse("qpsk"),
                level_db=3.0,
                symbols=SymbolSet.parse("2..3"),
            ),
        ),
        pilots=(
            Pilots(
                subcarriers=IndexSet.parse("61..63"),
                values=PilotValues.parse([1, [0, 1]]),
                symbols=SymbolSet.parse("0..2"),
            ),
        )
        if pilots
        else (),
        cyclic_prefix=CyclicPrefix.parse(["16 samples", "12 samples"]),
        edge_window=Stretch.parse(edge),
        **{"frame_symbols": 4, **more},
    )


def site_of(settings, n_cycles=1):
    cycle = settings.cycle(SPACING * 128, "signal")
    return Site(
        sample_rate_hz=SPACING * 128,
        n_samples=cycle.n_samples * n_cycles,
        seed=4,
        label="a",
        path="signal",
    )


def term_of(settings):
    return settings.term(site_of(settings))


def test_moments_cover_a_cycle_once():
    term = term_of(ofdm())
    assert sum(moments.count for moments in term.moments) == term.clock_samples == 4 * 142
    seen = np.concatenate(
        [(m.starts[:, None] + np.arange(m.low, m.high)).ravel() for m in term.moments]
    )
    assert sorted(seen.tolist()) == list(range(term.clock_samples))


@pytest.mark.parametrize("is_shifted", [False, True])
def test_what_is_known_is_the_mean_of_many_loops(is_shifted):
    """Silence the data: what is left is the pilots' part of the signal, exactly."""
    settings = ofdm(half_subcarrier_shift=is_shifted)
    term = term_of(settings)
    known = np.zeros(term.clock_samples, complex)
    for m in term.moments:
        if m.known is not None:
            known[m.starts[:, None] + np.arange(m.low, m.high)] = m.known
    signal = settings.build(site_of(settings))
    bodies = signal.inputs[0]
    quiet = type(bodies)(**(fields_of(bodies) | {"carried": ()}))
    from wavegen.core.render import samples_of

    alone = type(signal)(**(fields_of(signal) | {"inputs": (quiet,), "ideal": quiet}))
    # In a shifted signal prefix and edge change sign: only magnitudes count.
    assert np.abs(samples_of(alone)) == pytest.approx(np.abs(known), abs=1e-6)


def fields_of(item):
    return {name: getattr(item, name) for name in item.__dataclass_fields__}


@pytest.mark.parametrize("modulus", [1, 4, 71, 284])
def test_residues_average_to_the_whole(modulus):
    term = term_of(ofdm())
    angle = np.array([0.3, 2.0])
    flat = [term.characteristic(T, residue=r, modulus=modulus) for r in range(modulus)]
    assert np.mean(flat, axis=0) == pytest.approx(term.characteristic(T), abs=1e-13)
    if modulus <= 4:
        both = [term.directional(T, angle, residue=r, modulus=modulus) for r in range(modulus)]
        assert np.mean(both, axis=0) == pytest.approx(term.directional(T, angle), abs=1e-13)


def test_the_direction_averages_out():
    term = term_of(ofdm())
    angle = np.arange(64) * (2 * np.pi / 64)
    averaged = term.directional(T, angle).mean(axis=1)
    assert averaged.real == pytest.approx(term.characteristic(T), abs=1e-10)
    assert averaged.imag == pytest.approx(0, abs=1e-10)
    assert term.symmetry == 1


def test_a_single_index_is_its_own_product():
    # Sample 100 of the cycle: symbol 0, 16QAM on 50 subcarriers and three pilots.
    settings = ofdm()
    term = term_of(settings)
    (here,) = [
        m for m in term.moments if (m.starts[:, None] + np.arange(m.low, m.high) == 100).any()
    ]
    scale = math.sqrt(sum(part.power for part in term.drawn[here.sources[0][0]]))
    rings = np.sqrt(np.array([0.2, 1.0, 1.8])) * scale
    data = (scipy.special.j0(np.multiply.outer(T, rings)) @ [0.25, 0.5, 0.25]) ** 50
    known = abs(here.known[100 - here.low])
    want = data * scipy.special.j0(T * known)
    found = term.characteristic(T, residue=100, modulus=term.clock_samples)
    assert found == pytest.approx(want, abs=1e-13)


def test_plain_symbols_have_no_clock():
    plain = Ofdm(
        subcarrier_spacing_hz=SPACING,
        groups=(
            Group(
                subcarriers=IndexSet.parse("-50..50"), constellation=Constellation.parse("64qam")
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(["16 samples", "12 samples"]),
    )
    term = term_of(plain)
    assert (term.clock_samples, term.symmetry, term.mean_power) == (1, 0, 1.0)
    # Small t: 1 - t^2 P / 4 with P = 1, whatever the parts are.
    for settings in (plain, ofdm(), ofdm(edge="12 samples"), ofdm(pilots=False)):
        curve = term_of(settings).characteristic(np.array([1e-3]))
        assert (1 - curve[0]) * 4e6 == pytest.approx(1, rel=1e-6)


def test_long_edges_are_gathered():
    settings = Ofdm(
        subcarrier_spacing_hz=SPACING,
        groups=(
            Group(subcarriers=IndexSet.parse("-60..60"), constellation=Constellation.parse("qpsk")),
        ),
        cyclic_prefix=CyclicPrefix.parse("1/2"),
        edge_window=Stretch.parse("1/2"),
    )
    site = Site(sample_rate_hz=SPACING * 2048, n_samples=3072, seed=1, label="a", path="signal")
    term = settings.term(site)
    assert len(term.moments) == 129
    w = 0.5 - 0.5 * np.cos(np.pi * (np.arange(1024) + 0.5) / 1024)
    power = term.drawn[0][0].count * term.drawn[0][0].power
    # Gaussian to 0.2 % at t = 1: the mean over every sample of the edge, and the rest.
    variance = power * (w**2 + (1 - w) ** 2)
    want = (2048 * np.exp(-power / 4) + np.exp(-variance / 4).sum()) / 3072
    assert term.characteristic(np.array([1.0]))[0] == pytest.approx(want, abs=5e-4)
    assert term.characteristic(np.array([1e-3]))[0] == pytest.approx(1 - 2.5e-7, abs=1e-13)
