"""Laws of OFDM: moments, the exact sum at a sample, pilots, and generated loops.

Moments: ``E x^2 = 2 + k4 / N``, ``E x^3 = 6 + 9 k4 / N + k6 / N^2`` (derivation: cumulants of
independent fourfold-symmetric terms). Pilots: 200 equal ones at +3 dB among 1200 subcarriers
move the 0.1 % level from 8.4 to 16.9 dB (computed; Rice's law at each sample, 1944/45).
Edge and schedule: mixtures, by generated loops.
"""

import math
from fractions import Fraction

import numpy as np
import pytest
import scipy.special
from scipy.stats import binom, ncx2

from wavegen.core.render import Tap, render
from wavegen.core.site import Site
from wavegen.meters.power import PowerMeter
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.ofdm_parts import Group, Pilots
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

SPACING = Fraction(15000)


def ofdm(*groups, pilots=(), prefix="0 samples", edge="0 samples", **more):
    return Ofdm(
        subcarrier_spacing_hz=SPACING,
        groups=tuple(
            Group(
                subcarriers=IndexSet.parse(subcarriers),
                constellation=Constellation.parse(constellation),
                **settings,
            )
            for subcarriers, constellation, settings in groups
        ),
        pilots=tuple(
            Pilots(
                subcarriers=IndexSet.parse(subcarriers),
                values=PilotValues.parse(values),
                level_db=level_db,
            )
            for subcarriers, values, level_db in pilots
        ),
        cyclic_prefix=CyclicPrefix.parse(prefix),
        edge_window=Stretch.parse(edge),
        **more,
    )


def site(settings, n_fft, n_samples=0):
    cycle = settings.cycle(SPACING * n_fft, "signal").n_samples
    return Site(
        sample_rate_hz=SPACING * n_fft,
        n_samples=cycle * max(n_samples // cycle, 1),
        seed=3,
        label="a",
        path="signal",
    )


@pytest.mark.parametrize("n", [48, 64, 300])
@pytest.mark.parametrize(
    ("constellation", "fourth", "sixth"), [("qpsk", 1.0, 1.0), ("16qam", 1.32, 1.96)]
)
def test_moments_of_the_law(n, constellation, fourth, sixth):
    # E x^2 = 2 int x P dx, E x^3 = 3 int x^2 P dx; Simpson's rule on the law's own curve: 1e-9.
    settings = ofdm((f"0..{n - 1}", constellation, {}))
    law = settings.law(site(settings, 1024))
    x = np.linspace(0, 60, 6001)
    above = law.ccdf(10 * np.log10(np.maximum(x, 1e-30)))
    weights = np.r_[1, np.tile([4, 2], 2999), 4, 1] / 300
    k4, k6 = fourth - 2, sixth - 9 * fourth + 12
    assert np.sum(weights * above) == pytest.approx(1, abs=1e-9)
    assert 2 * np.sum(weights * x * above) == pytest.approx(2 + k4 / n, abs=1e-8)
    assert 3 * np.sum(weights * x**2 * above) == pytest.approx(6 + 9 * k4 / n + k6 / n**2, abs=1e-6)


def test_levels_of_48_turned_points_by_arbitrary_precision():
    """P(R > r) = 1 - r int J0(t / sqrt 48)^48 J1(t r) dt by mpmath: 0.0001 dB down to 1e-9."""
    mpmath = pytest.importorskip("mpmath")
    settings = ofdm(("0..47", "qpsk", {}))
    law = settings.law(site(settings, 512))
    with mpmath.workdps(30):
        amplitude = 1 / mpmath.sqrt(48)
        for probability in (1e-3, 1e-9):
            level_db = float(law.level_db(probability))
            r = mpmath.mpf(10) ** (mpmath.mpf(level_db) / 20)

            def wave(t, r=r):
                return mpmath.besselj(0, t * amplitude) ** 48 * mpmath.besselj(1, t * r)

            cuts = [mpmath.mpf(k) for k in range(0, 17, 2)]
            exact = float(1 - r * mpmath.quad(wave, cuts))
            slope = 4.343 / (10 ** (level_db / 10) * 0.9)  # dB for a relative change
            assert abs(exact / probability - 1) * slope < 1e-4


def test_200_equal_pilots_among_1200():
    """8.4 to 16.9 dB at 0.1 %; the curve is the mean of Rice's law over the samples.

    Every sixth subcarrier is a pilot: six peaks a symbol, sampled finely (6.8-fold).
    """
    used = [k for k in range(-600, 601) if k]
    pilots, data = used[::6], [k for k in used if k not in used[::6]]
    names = [",".join(map(str, some)) for some in (pilots, data, used)]
    with_pilots = ofdm((names[1], "16qam", {}), pilots=[(names[0], [1], 3.0)])
    without = ofdm((names[2], "16qam", {}))
    n_fft = 8192
    level_db = float(with_pilots.law(site(with_pilots, n_fft)).level_db(1e-3))
    assert level_db == pytest.approx(16.9, abs=0.05)
    assert float(without.law(site(without, n_fft)).level_db(1e-3)) == pytest.approx(8.39, abs=0.01)
    total = 1000 + 200 * 10**0.3
    grid = np.zeros(n_fft, complex)
    grid[pilots] = math.sqrt(10**0.3 / total)
    known = np.abs(np.fft.ifft(grid) * n_fft) ** 2
    noise = 1000 / total
    x = 10 ** (level_db / 10)
    rice = ncx2.sf(2 * x / noise, 2, 2 * known / noise).mean()
    # 1000 subcarriers are Gaussian to 0.1 % of the probability here.
    assert rice == pytest.approx(1e-3, rel=0.005)


def test_samples_where_all_constellations_stand_alike():
    """At the first sample of a symbol of 64 QPSK subcarriers both rails are binomial, exactly.

    The law takes that sample for one like the others. It is 4 of 64 at critical sampling, where
    that changes the probability by 1 % at most, a level by 0.005 dB.
    """
    settings = ofdm(("-32..31", "qpsk", {}))
    law = settings.law(site(settings, 64))
    rail = (2 * np.arange(65) - 64) / math.sqrt(128)
    power = np.add.outer(rail**2, rail**2)
    share = np.multiply.outer(binom.pmf(np.arange(65), 64, 0.5), binom.pmf(np.arange(65), 64, 0.5))
    for probability in (1e-2, 1e-3, 1e-4, 1e-6, 1e-9):
        level_db = float(law.level_db(probability))
        aligned = share[power > 10 ** (level_db / 10)].sum()
        mixed = (60 * probability + 4 * aligned) / 64
        assert mixed == pytest.approx(probability, rel=0.01)


CASES = {
    "prefix and edge": (
        64,
        ofdm(("-26..-1, 1..26", "64qam", {}), prefix="16 samples", edge="8 samples"),
    ),
    "pilots": (
        2048,
        ofdm(
            ("-600..-1, 1..400", "16qam", {}),
            pilots=[("401..600", [1], 3.0)],
            prefix=["160/2048", "6 x 144/2048"],
            edge="72/2048",
        ),
    ),
    "schedule": (
        256,
        ofdm(
            ("-100..-1", "16qam", {"symbols": SymbolSet.parse("0..3")}),
            ("1..100", "qpsk", {"symbols": SymbolSet.parse("2..5"), "level_db": 6.0}),
            pilots=[("101..110", [1, -1], 3.0)],
            prefix="1/8",
            edge="1/16",
            frame_symbols=7,
        ),
    ),
    "half shift": (
        256,
        ofdm(
            ("-60..59", "qpsk", {}),
            pilots=[("60..70", [1], 6.0)],
            prefix="1/8",
            edge="1/8",
            half_subcarrier_shift=True,
        ),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_generated_loops_follow_their_law(name):
    """4 sigma of the share; symbols are independent, samples within them not: counted as
    ``n / V`` with V = 3 (papers on fourfold oversampling), or by symbols where pilots decide.
    """
    n_fft, settings = CASES[name]
    here = site(settings, n_fft, 2_000_000)
    law, signal = settings.law(here), settings.build(here)
    measured = render(
        signal, taps=(Tap(name="power", signal=signal, meter=PowerMeter()),), workers=2
    )["power"]
    for probability in (0.5, 0.1, 1e-2, 1e-3, 1e-4):
        level_db = float(law.level_db(probability)) + 10 * math.log10(1 / measured.mean)
        found = float(measured.ccdf(level_db))
        sigma = math.sqrt(6 * probability * (1 - probability) / here.n_samples)
        # A bin of the meter, 0.0085 dB, by the slope of the law there.
        bin_share = abs(float(law.ccdf(level_db + 0.0085)) - float(law.ccdf(level_db - 0.0085)))
        assert found == pytest.approx(probability, abs=4 * sigma + bin_share)


def test_an_edge_is_a_mixture_of_variances():
    """Gaussian limit: ``exp(-x / v)`` with ``v = w^2 + (1 - w)^2`` at each sample of the edge."""
    n, prefix, edge = 2048, 512, 512
    settings = ofdm(("-600..-1, 1..600", "64qam", {}), prefix="1/4", edge="1/4")
    law = settings.law(site(settings, n))
    w = 0.5 - 0.5 * np.cos(np.pi * (np.arange(edge) + 0.5) / edge)
    variance = np.concatenate((np.ones(n + prefix - edge), w**2 + (1 - w) ** 2))
    for level_db in (0.0, 6.0, 9.0):
        x = 10 ** (level_db / 10) * variance.mean()
        # 1 / N: k4 x^2 / 4 N of the probability, 1.2 % at 9 dB.
        want = np.exp(-x / variance).mean()
        assert float(law.ccdf(level_db)) == pytest.approx(want, rel=0.015)


def test_random_turns_and_true_angles_have_one_average():
    """The exact function of 48 QPSK subcarriers, averaged over every sample of a symbol.

    At sample n subcarrier k is turned by ``2 pi k n / N``; the product over subcarriers of
    ``cos cos``, averaged over direction and over the 512 samples, against the isotropic product:
    1e-3 of it where it is above 1e-9 (second order in the anisotropy, ``t^8 / N^3``).
    """
    n_fft, t = 512, np.linspace(0.5, 8, 12)
    direction = (np.arange(24) + 0.5) * (np.pi / 2 / 24)
    exact = np.zeros(t.size)
    for n in range(n_fft // 4):  # a turn by a quarter changes nothing
        turned = direction[:, None] - 2 * np.pi * np.arange(48) * n / n_fft
        waves = t[:, None, None] / math.sqrt(96)
        product = np.prod(
            np.cos(waves * np.sqrt(1) * np.cos(turned)) * np.cos(waves * np.sin(turned)), axis=2
        )
        exact += product.mean(axis=1) / (n_fft // 4)
    isotropic = scipy.special.j0(t / math.sqrt(48)) ** 48
    assert exact == pytest.approx(isotropic, abs=2e-6)
