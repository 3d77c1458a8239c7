"""Laws behind converters against closed forms in 20 digits, and against exact sums over codes."""

import math
from fractions import Fraction

import mpmath as mp
import numpy as np
import pytest
from scipy.special import erf, ndtr

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.hoyt import HoytLaw
from wavegen.laws.quantised import CIRCLE, MOST_ERROR_DB, quantised_law, step_error_db
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text
from wavegen.sources.noise import Noise
from wavegen.stages.converter.dc_offset import DcOffset
from wavegen.stages.converter.iq_imbalance import IqImbalance
from wavegen.stages.converter.quantise import Quantise

mp.mp.dps = 20
PROBABILITIES = (0.5, 0.1, 1e-3, 1e-6, 1e-9)
RATE = Fraction(1_000_000)
OFDM = (
    "{kind: ofdm, subcarrier_spacing: 20 kHz, cyclic_prefix: 1/8, "
    "groups: [{subcarriers: '-60..-1, 1..60', constellation: 64qam}]}"
)
QPSK = (
    "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, "
    "pulse: {kind: root_raised_cosine, roll_off: 0.22}}"
)


def site(n):
    return Site(sample_rate_hz=RATE, n_samples=n, seed=3, label="a", path="stages[0]")


def hoyt_above(b, x):
    """Density of the power of two independent rails of variances (1 + b)/2 and (1 - b)/2."""
    b, x = mp.mpf(b), mp.mpf(x)
    c = 1 - b * b

    def density(p):
        # exp(-p/c) I0(b p/c) without overflow: for large arguments by its integral form.
        return mp.exp(-p / c) * mp.besseli(0, b * p / c) / mp.sqrt(c)

    return mp.quad(density, [x, x + 4, x + 90])


def rice_above(k, x):
    """Marcum's Q function of order 1: a line of power k beside noise of power 1, over the noise."""
    k, x = mp.mpf(k), mp.mpf(x)

    def density(p):
        return mp.exp(-p - k) * mp.besseli(0, 2 * mp.sqrt(k * p))

    return mp.quad(density, [x, x + 4, x + 90])


def error_db(law, probability, above):
    """Return by how much a level of a law is wrong: its true probability over the slope there."""
    level_db = float(law.level_db(probability))
    around = np.log(law.ccdf([level_db - 0.01, level_db + 0.01]))
    true = above(mp.mpf(10) ** (mp.mpf(level_db) / 10))
    return float(mp.log(true / probability)) / float((around[0] - around[1]) / 0.02)


class TestImage:
    @pytest.mark.parametrize("b", [0.05, 0.3, 0.9, 0.99])
    def test_hoyt(self, b):
        """R. S. Hoyt 1947: the density is that of two independent rails; integrated with mpmath."""
        law = HoytLaw(impropriety=b)
        for x in (0.01, 3.0, 30.0):
            want = float(hoyt_above(b, x))
            assert float(law.ccdf(10 * math.log10(x))) == pytest.approx(want, rel=1e-11)
        for probability in (0.1, 1e-9):
            assert abs(error_db(law, probability, lambda x: hoyt_above(b, x))) < 1e-8

    def test_its_ends(self):
        """No impropriety: exponential. All of it: one rail, ``erfc(sqrt(x/2))``."""
        level_db = np.array([-10.0, 0.0, 8.0, 13.0])
        assert HoytLaw(impropriety=0.0).ccdf(level_db) == pytest.approx(
            GaussianLaw().ccdf(level_db), rel=1e-14
        )
        rail = [math.erfc(math.sqrt(10 ** (one / 10) / 2)) for one in level_db]
        assert HoytLaw(impropriety=1.0).ccdf(level_db) == pytest.approx(rail, rel=1e-8)

    def test_moments(self):
        """E p^2 of two independent rails: 2 + b^2 (fourth moments of Gaussian rails)."""
        assert HoytLaw(impropriety=0.6).moment(2) == pytest.approx(2.36, rel=1e-14)

    @pytest.mark.parametrize(("gain_db", "phase_deg"), [(1.0, 0.0), (0.5, 6.0), (12.0, -30.0)])
    def test_impropriety_of_a_modulator(self, gain_db, phase_deg):
        """Rails g_I exp(-j phi/2) I and j g_Q exp(j phi/2) Q of independent I, Q of one variance:
        covariance of the two components, its eigenvalues by NumPy."""
        half, g = math.radians(phase_deg) / 2, 10 ** (gain_db / 40)
        mixing = np.array(
            [[g * math.cos(half), -math.sin(half) / g], [-g * math.sin(half), math.cos(half) / g]]
        )
        low, high = np.linalg.eigvalsh(mixing @ mixing.T)
        law = IqImbalance(gain_db=gain_db, phase_deg=phase_deg).law(site(1), GaussianLaw())
        assert law.impropriety == pytest.approx((high - low) / (high + low), rel=1e-12)


class TestConstant:
    @pytest.mark.parametrize("level_db", [-30.0, -10.0, 3.0])
    def test_rice(self, level_db):
        """S. O. Rice 1944/45; noncentral chi-square of two degrees: Marcum's Q, with mpmath."""
        law = DcOffset(level_db=level_db, phase_deg=30.0).law(site(1), GaussianLaw())
        k = mp.mpf(10) ** (mp.mpf(level_db) / 10)
        for probability in PROBABILITIES:
            assert abs(error_db(law, probability, lambda x: rice_above(k, x * (1 + k)))) < 1e-3


def codes_of(step, reach, rms=1.0):
    """Return powers and probabilities of all codes of circular Gaussian noise in one quadrant."""
    count = int(reach / step) + 2
    edges = (np.arange(count + 1) - 0.5) * step * math.sqrt(2) / rms  # each rail has half the power
    rail = 2 * (ndtr(-edges[:-1]) - ndtr(-edges[1:]))
    rail[0] = erf(edges[1] / math.sqrt(2))
    codes = (np.arange(count) * step) ** 2
    power = np.add.outer(codes, codes).ravel()
    share = np.multiply.outer(rail, rail).ravel()
    kept = power <= ((count - 1) * step) ** 2
    order = np.argsort(power[kept])[::-1]
    return power[kept][order], np.cumsum(share[kept][order]), 2 * float(np.sum(codes * rail))


class TestSteps:
    def errors_db(self, step):
        """Return by how much levels of quantised Gaussian noise differ from its law, exactly."""
        power, above, mean = codes_of(step, 6.0)
        probabilities = np.geomspace(0.36, 1e-9, 400)
        place = np.searchsorted(above, probabilities, side="right")
        found = 10 * np.log10(power[place] / mean)
        return np.abs(found - GaussianLaw().level_db(probabilities))

    @pytest.mark.parametrize("bits", [12, 14])
    def test_the_coarsest_steps_let_pass(self, bits):
        """All codes of a Gaussian signal, added up: no level from the mean up to that at 1e-9
        differs by more than is said; the sum leaves 2e-16 out."""
        full_scale_db = 12.0 if bits == 12 else 24.04
        said = step_error_db(GaussianLaw(), bits=bits, full_scale_db=full_scale_db)
        assert 0.85e-3 < said < MOST_ERROR_DB
        step = 10 ** (full_scale_db / 20) / 2 ** (bits - 1)
        errors = self.errors_db(step)
        assert errors.max() < said
        assert errors.max() > 0.05 * said  # no bound out of all proportion

    def test_coarse_steps_do_move_levels(self):
        """8 bits at 12 dB: what is refused is more than 0.001 dB wrong."""
        assert not hasattr(quantised_law(GaussianLaw(), bits=8, full_scale_db=12.0), "level_db")
        assert self.errors_db(10**0.6 / 128).max() > 2 * MOST_ERROR_DB

    def test_points_of_a_lattice_in_a_circle(self):
        """Gauss: every radius to 1500; 200 more to 1e4, a tenth more."""
        highest = 1500
        squares = np.arange(-highest, highest + 1) ** 2
        sums = np.add.outer(squares, squares).ravel()
        counts = np.cumsum(np.bincount(sums[sums <= highest**2]))
        area = np.pi * np.arange(counts.size, dtype=np.float64)
        radius = np.sqrt(np.arange(1, counts.size))
        at, before = np.abs(counts - area)[1:], np.abs(counts[:-1] - area[1:])
        assert np.max(np.maximum(at, before) / np.sqrt(radius)) < CIRCLE
        for radius in np.geomspace(1500, 1e4, 200):
            x = np.arange(1, int(radius) + 1)
            inside = 1 + 4 * int(radius) + 4 * int(np.sum(np.floor(np.sqrt(radius**2 - x**2))))
            assert abs(inside - np.pi * radius**2) < 1.1 * CIRCLE * math.sqrt(radius)

    @pytest.mark.parametrize(
        "signal",
        [
            QPSK,
            QPSK.replace("qpsk", "16qam").replace("1 MHz", "1600 kHz").replace("0.22", "0.35"),
            OFDM,
        ],
        ids=["QPSK", "16QAM", "OFDM"],
    )
    def test_records_before_and_behind(self, signal):
        """The same samples before and behind 11 to 14 bits at 12 dB: levels to 1 % agree as is
        said. A million samples: neighbours in order lie 2e-5 of a level apart there."""
        text = f"wavegen: 1\nsample_rate: 4 MHz\nduration: 250 ms\nsignal: {signal}\n"
        prepared = prepare(load_text(text, name="case", overrides=()))
        source = prepared.built.signal
        law = law_of_recipe(prepared.loaded.recipe.signal, (), prepared.site)
        plain = samples_of(source).astype(np.complex128)
        for bits in (11, 12, 14):
            behind = samples_of(
                Quantise(bits=bits, full_scale_db=12.0).build(prepared.site, source)
            )
            levels = []
            for one in (plain, behind.astype(np.complex128)):
                power = np.abs(one) ** 2
                kept = np.quantile(power, [0.7, 0.9, 0.97, 0.99]) / power.mean()
                levels.append(10 * np.log10(kept))
            said = step_error_db(law, bits=bits, full_scale_db=12.0)
            assert np.max(np.abs(levels[1] - levels[0])) < said
        assert said < MOST_ERROR_DB


class TestRecords:
    """Levels of a million samples behind the stages against the law: 4 sigma of a share."""

    def check(self, stage, signal):
        text = f"wavegen: 1\nseed: 8\nsample_rate: 4 MHz\nduration: 300 ms\nsignal: {signal}\n"
        loaded = load_text(text + f"stages: [{stage}]\n", name="case", overrides=())
        prepared = prepare(loaded)
        law = law_of_recipe(loaded.recipe.signal, loaded.recipe.stages, prepared.site)
        power = np.abs(samples_of(prepared.built.signal).astype(np.complex128)) ** 2
        power /= power.mean()
        for probability in (0.3, 0.1, 0.01, 1e-3):
            level_db = float(law.level_db(probability))
            share = float(np.mean(power > 10 ** (level_db / 10)))
            # Four samples a symbol hang together: at most as if one in four counted; the mean
            # moves levels by 0.01 dB.
            sigma = math.sqrt(4 * probability / power.size)
            near = abs(float(law.ccdf(level_db + 0.01)) - float(law.ccdf(level_db - 0.01)))
            assert share == pytest.approx(probability, abs=4 * sigma + near)
        return law

    def test_ofdm_with_its_image(self):
        law = self.check("{kind: iq_imbalance, gain: 3 dB, phase: 10 deg}", OFDM)
        # 60 subcarriers are nearly Gaussian: Hoyt's levels, 0.05 dB at 1e-3.
        want = IqImbalance(gain_db=3.0, phase_deg=10.0).law(site(1), GaussianLaw())
        assert float(law.level_db(1e-3)) == pytest.approx(float(want.level_db(1e-3)), abs=0.1)

    @pytest.mark.parametrize("signal", [OFDM, QPSK], ids=["OFDM", "QPSK"])
    def test_a_constant_beside_modulation(self, signal):
        self.check("{kind: dc_offset, level: -12 dB, phase: 20 deg}", signal)

    def test_noise_with_its_image(self):
        self.check("{kind: iq_imbalance, gain: 4 dB}", "{kind: noise, bandwidth: 4 MHz}")


def test_a_million_samples_of_noise_follow_hoyt():
    n = 1 << 20
    source = Noise(bandwidth_hz=RATE).build(site(n))
    stage = IqImbalance(gain_db=6.0, phase_deg=20.0)
    power = np.abs(samples_of(stage.build(site(n), source)).astype(np.complex128)) ** 2
    law = stage.law(site(n), GaussianLaw())
    for probability in (0.3, 0.03, 1e-3):
        level = 10 ** (float(law.level_db(probability)) / 10)
        share = float(np.mean(power > level * power.mean()))
        assert share == pytest.approx(probability, abs=5 * math.sqrt(probability / n))
