"""Converter effects against their closed forms, and against published figures of quantisers."""

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.sources.carrier import Carrier
from wavegen.sources.noise import Noise
from wavegen.stages.converter.clock_jitter import ClockJitter
from wavegen.stages.converter.dc_offset import DcOffset
from wavegen.stages.converter.hold_droop import HoldDroop
from wavegen.stages.converter.iq_imbalance import IqImbalance
from wavegen.stages.converter.phase_noise import PhaseMask, PhaseNoise
from wavegen.stages.converter.quantise import Quantise, Quantised

RATE = Fraction(1_000_000)


def site(n):
    return Site(sample_rate_hz=RATE, n_samples=n, seed=3, label="a", path="stages[0]")


@dataclass(frozen=True, eq=False, kw_only=True)
class Tone(Signal):
    """A tone of unit amplitude."""

    cycles: int

    def compute(self, start, stop, *arrays):
        turns = np.arange(start, stop) * self.cycles % self.n_samples / self.n_samples
        return np.exp(2j * np.pi * turns).astype(np.complex64)


def tone(n, cycles):
    return Tone(sample_rate_hz=RATE, n_samples=n, cycles=cycles)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples as given."""

    values: np.ndarray

    def compute(self, start, stop, *arrays):
        return self.values[start:stop].astype(np.complex64)


def noise(n):
    return Noise(bandwidth_hz=RATE).build(site(n))


def errors_of(settings, source):
    x = samples_of(source).astype(np.complex128)
    y = samples_of(settings.build(site(source.n_samples), source)).astype(np.complex128)
    return np.abs(y - x) ** 2 / np.mean(np.abs(x) ** 2)


def check(errors, want):
    """4 standard errors, from 64 stretches."""
    scatter = errors[: errors.size // 64 * 64].reshape(64, -1).mean(axis=1).std(ddof=1) / 8
    assert errors.mean() == pytest.approx(want, abs=4 * scatter)
    assert scatter < 0.02 * want


class TestQuantiser:
    @pytest.mark.parametrize("bits", [6, 8, 12, 14])
    def test_rounding_noise_of_gaussian_rails(self, bits):
        """6.02 b + 1.76 - back-off: W. R. Bennett 1948; float32 itself lies at -150 dB."""
        errors = errors_of(Quantise(bits=bits, full_scale_db=13.5), noise(1 << 16))
        check(errors, 10 ** (-(6.0206 * bits + 1.7609 - 13.5) / 10))

    def test_rounding_noise_of_a_tone_at_full_scale(self):
        """6.02 b + 1.76 as it is quoted of a sine that fills the range; 12 bits."""
        errors = errors_of(Quantise(bits=12, full_scale_db=0.01), tone(1 << 16, 9973))
        assert -10 * math.log10(errors.mean()) == pytest.approx(6.0206 * 12 + 1.7609, abs=0.15)

    @pytest.mark.parametrize(
        ("bits", "loading_db", "ratio_db"),
        [(8, 11.88, 40.60), (10, 13.05, 51.56), (12, 14.00, 62.71), (14, 14.80, 74.01)],
    )
    def test_best_loading_of_gaussian_noise(self, bits, loading_db, ratio_db):
        """G. A. Gray, G. W. Zeoli 1971: RMS of a rail below full scale at which the noise of
        rounding and clipping together is least, and the ratio there, tabled to 0.005 dB. The
        rail runs evenly through 8 standard deviations, each place weighed by its density. Two's
        complement ends a step short of full scale on one side, which costs 0.03 dB at 8 bits
        and half of that for each bit more."""
        n = 1 << 20
        rail = np.linspace(-8, 8, n).astype(np.float32).astype(np.float64)
        source = Held(sample_rate_hz=RATE, n_samples=n, values=rail + 0j)
        code = 10 ** (loading_db / 20) / 2 ** (bits - 1)
        made = Quantised(sample_rate_hz=RATE, n_samples=n, inputs=(source,), bits=bits, code=code)
        weight = np.exp(-(rail**2) / 2)
        error = np.sum((samples_of(made).real - rail) ** 2 * weight) / np.sum(weight)
        assert -10 * math.log10(error) == pytest.approx(
            ratio_db, abs=0.006 + 0.03 * 2.0 ** (8 - bits)
        )

    @pytest.mark.parametrize("full_scale_db", [3.0, 6.0, 9.0])
    def test_share_of_codes_cut(self, full_scale_db):
        """A Gaussian rail passes full scale for ``erfc(F / (sqrt 2 sigma))`` of the time."""
        n = 1 << 17
        where = site(n)
        Quantise(bits=12, full_scale_db=full_scale_db).build(where, noise(n))
        told = float(where.notes[0].text.split("below the mean; ")[1].split()[0])
        want = math.erfc(10 ** (full_scale_db / 20))
        # Two digits are told; 4 sigma of a count of 2 n codes.
        assert told == pytest.approx(want, abs=4 * math.sqrt(want / (2 * n)) + 0.05 * want)


class TestHold:
    @pytest.mark.parametrize(
        ("share", "droop_db"), [(0.1, 0.143), (0.25, 0.912), (0.4, 2.42), (0.45, 3.115)]
    )
    def test_droop_and_its_inverse(self, share, droop_db):
        """sin(x)/x at parts of the converter's rate, tabled from the formula by hand."""
        n = 2000
        x = math.pi * share
        assert -20 * math.log10(math.sin(x) / x) == pytest.approx(droop_db, abs=6e-4)
        source = tone(n, round(share * n))
        for is_inverse in (False, True):
            got = samples_of(HoldDroop(inverse=is_inverse).build(site(n), source))
            sign = 1 if is_inverse else -1
            level_db = 20 * np.log10(np.abs(got))
            np.testing.assert_allclose(level_db, sign * droop_db, atol=8e-4)


class TestJitter:
    @pytest.mark.parametrize(("share", "centre"), [(0.1, 0), (0.4, 0), (0.05, 2_000_000)])
    def test_signal_to_noise(self, share, centre):
        """-20 log10(2 pi f sigma) of a tone; its second order is 1e-4 of it here."""
        sigma = 2e-9
        settings = ClockJitter(rms_s=sigma, centre_hz=Fraction(centre))
        errors = errors_of(settings, tone(1 << 16, round(share * (1 << 16))))
        frequency = share * 1e6 + centre
        check(errors, (2 * math.pi * frequency * sigma) ** 2)

    def test_noise_of_a_flat_band(self):
        """Mean of (2 pi f sigma)^2 over a band B: (pi B sigma)^2 / 3."""
        band = 500_000
        source = Noise(bandwidth_hz=Fraction(band), edge_fraction=0.01).build(site(1 << 16))
        errors = errors_of(ClockJitter(rms_s=5e-9), source)
        want = (math.pi * band * 5e-9) ** 2 / 3
        assert errors.mean() == pytest.approx(want, rel=0.06)  # the band's own lines scatter 2 %


class TestPhaseNoise:
    MASK = PhaseMask.parse(
        [["500 Hz", "-55 dBc/Hz"], ["5 kHz", "-75 dBc/Hz"], ["50 kHz", "-95 dBc/Hz"]]
    )

    def test_spectrum_of_a_carrier_is_the_mask(self):
        n = 1 << 18
        signal = PhaseNoise(mask=self.MASK).build(site(n), Carrier().build(site(n)))
        lines = np.abs(np.fft.fft(samples_of(signal).astype(np.complex128)) / n) ** 2
        offset = np.fft.fftfreq(n, 1e-6)
        for low, high in ((1e3, 2e3), (4e3, 6e3), (1e4, 2e4), (1e5, 2e5), (3e5, 5e5)):
            for sign in (1, -1):
                inside = (sign * offset >= low) & (sign * offset < high)
                want = self.MASK.density(np.abs(offset[inside])).mean() * 1e6 / n
                got = lines[inside].mean()
                # 4 sigma of exponential lines; the phase of 0.06 rad RMS is not quite small.
                assert got == pytest.approx(want, rel=4 / math.sqrt(inside.sum()) + 0.02)

    def test_integrated_phase(self):
        """sqrt(2 int L df) by hand: -20 dB a decade is 1/f^2, whose integral is f0 L0 each."""
        pieces = (
            500 * 10**-5.5 * (1 - 0.1)  # from 500 Hz to 5 kHz
            + 5e3 * 10**-7.5 * (1 - 0.1)  # to 50 kHz
            + 10**-9.5 * 450e3  # flat to half the rate
        )
        assert self.MASK.phase_rad(500, 5e5) == pytest.approx(math.sqrt(2 * pieces), rel=1e-6)
        n = 1 << 18
        signal = PhaseNoise(mask=self.MASK).build(site(n), Carrier().build(site(n)))
        phase = np.fft.fft(np.angle(samples_of(signal).astype(np.complex128))) / n
        offset = np.abs(np.fft.fftfreq(n, 1e-6))
        seen = np.sum(np.abs(phase[offset >= 500]) ** 2)
        # Power weighs some 130 lines about 500 Hz most: 4 sigma.
        assert seen == pytest.approx(2 * pieces, rel=0.35)


@pytest.mark.parametrize(
    ("gain_db", "phase_deg", "quoted_db"), [(1.0, 0.0, 24.8), (0.0, 1.0, 41.2), (0.1, 1.0, 39.6)]
)
def test_image_rejection(gain_db, phase_deg, quoted_db):
    """(1 + g^2 + 2 g cos phi) / (1 + g^2 - 2 g cos phi), and rounded figures of the trade."""
    g, phi = 10 ** (gain_db / 20), math.radians(phase_deg)
    ratio = (1 + g * g + 2 * g * math.cos(phi)) / (1 + g * g - 2 * g * math.cos(phi))
    assert 10 * math.log10(ratio) == pytest.approx(quoted_db, abs=0.06)
    n = 1000
    signal = IqImbalance(gain_db=gain_db, phase_deg=phase_deg).build(site(n), tone(n, 123))
    lines = np.abs(np.fft.fft(samples_of(signal).astype(np.complex128))) ** 2
    assert lines[123] / lines[-123] == pytest.approx(ratio, rel=1e-3)


class TestDc:
    def test_level_over_the_signal(self):
        n = 1000
        signal = DcOffset(level_db=-37.0).build(site(n), tone(n, 7))
        lines = np.abs(np.fft.fft(samples_of(signal).astype(np.complex128))) ** 2
        assert 10 * math.log10(lines[0] / lines[7]) == pytest.approx(-37.0, abs=1e-4)

    def test_noise_with_a_constant_is_rician(self):
        """S. O. Rice 1944/45: ``P(R > r) = Q1(a sqrt 2, r sqrt 2)``, through its series."""
        a2 = 10**-0.3
        law = DcOffset(level_db=-3.0).law(site(1), GaussianLaw())
        for level_db in (-10.0, 0.0, 4.0, 8.0, 10.0):
            r2 = 10 ** (level_db / 10) * (1 + a2)
            below, weight, tail, term = 0.0, math.exp(-a2), math.exp(-r2), math.exp(-r2)
            for k in range(60):  # a Poisson mixture of gamma distributions
                below += weight * tail
                weight *= a2 / (k + 1)
                term *= r2 / (k + 1)
                tail += term
            assert float(law.ccdf(level_db)) == pytest.approx(below, abs=1e-9)
