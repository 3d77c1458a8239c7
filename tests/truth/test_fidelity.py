"""Fidelity figures against closed forms: clipped Gaussian, blocks, cubic metric, noise.

Sources: clipped complex Gaussian and its spectrum: Bussgang, 1952; H. Rowe, Bell Syst. Tech. J. 61,
1982; H. Ochiai, H. Imai, IEEE Trans. Commun. 50(1), 2002 (formulas from memory, derived again: the
distortion is a series of (2n + 1)-fold convolutions of the signal's spectrum, weighted by its
Laguerre coefficients). Cubic metric: 3GPP R1-060385 and moments of linear modulation (derived).
"""

from fractions import Fraction

import numpy as np
import pytest
import scipy.fft

from wavegen.core.render import Tap, render, samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.stored import Stored
from wavegen.meters.aclr import MeasuredChannel, aclr
from wavegen.meters.cubic import CubicMeter
from wavegen.meters.evm import waveform_sums
from wavegen.meters.evm_probe import EvmSettings, measure_evm
from wavegen.meters.fidelity import measure_fidelity
from wavegen.meters.limits import evm_limit
from wavegen.meters.occupied_bandwidth import occupied_bandwidth
from wavegen.meters.spectrum import spectrum_of
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.sources.subcarriers import IndexSet
from wavegen.stages.combine.sum import Part, Sum

N = 1 << 18
BAND = 8
"""Samples over the width of the band."""

CLIPPED = {
    4: (9.81, 10.43, 7.78, 27.68, 42.29),
    6: (4.13, 4.21, 3.17, 34.84, 47.54),
    8: (1.09, 1.09, 0.79, 45.97, 56.34),
}
"""Clip ratio, dB: total error fitted and unfitted, in band, percent; first and second ACLR, dB."""


def site(rate, n):
    return Site(sample_rate_hz=Fraction(rate), n_samples=n, seed=1, label="x", path="signal")


def flat_gaussian(seed):
    """A loop whose lines inside 1/8 of the sample rate are independent complex Gaussian."""
    rng = np.random.default_rng(seed)
    lines = np.zeros(N, complex)
    half = N // (2 * BAND)
    place = np.arange(-half, half)
    lines[place] = rng.standard_normal(place.size) + 1j * rng.standard_normal(place.size)
    samples = scipy.fft.ifft(lines)
    return samples / np.sqrt(np.mean(np.abs(samples) ** 2))


def clip(samples, ratio_db):
    limit = 10 ** (ratio_db / 20)
    return samples * np.minimum(1, limit / np.maximum(np.abs(samples), 1e-30))


@pytest.mark.parametrize("ratio_db", CLIPPED)
def test_clipped_gaussian_total_error(ratio_db) -> None:
    """Five standard errors: the number of independent clips is about N / 8 e^-g a loop, of which
    16 are averaged; the table is rounded to 0.005."""
    fitted, unfitted, *_ = CLIPPED[ratio_db]
    n_loops = 16
    n_clips = n_loops * N / BAND * np.exp(-(10 ** (ratio_db / 10)))
    tolerance = 5 / np.sqrt(n_clips)
    errors = []
    for seed in range(n_loops):
        sent = flat_gaussian(seed)
        sums = waveform_sums(clip(sent, ratio_db), sent)
        errors.append((sums.fitted_percent, sums.unfitted_percent))
    found = np.sqrt(np.mean(np.square(errors), axis=0))
    assert found[0] == pytest.approx(fitted, rel=tolerance, abs=0.005)
    assert found[1] == pytest.approx(unfitted, rel=tolerance, abs=0.005)
    assert tolerance < 0.2


@pytest.mark.parametrize("ratio_db", CLIPPED)
def test_clipped_gaussian_leaks_into_the_next_channels(ratio_db) -> None:
    """Tolerance: 0.1 dB, and as above for the number of clips; edges of the window's reach are
    left out of the square filters, 3 % of the flat density each."""
    first_db, second_db = CLIPPED[ratio_db][3:]
    n_clips = 4 * N / BAND * np.exp(-(10 ** (ratio_db / 10)))
    tolerance = 0.1 + 10 * np.log10(1 + 5 / np.sqrt(n_clips))
    width = 1.0
    ratios = []
    for seed in range(4):
        found = spectrum_of(
            clip(flat_gaussian(seed), ratio_db).astype(np.complex64), sample_rate_hz=BAND
        )
        neighbours = [
            MeasuredChannel(offset_hz=side * n * width, bandwidth_hz=width)
            for n in (1, 2)
            for side in (-1, 1)
        ]
        guard = 12 * found.bin_hz  # what the window spreads of the carrier's edge
        inner = [
            MeasuredChannel(
                offset_hz=channel.offset_hz + np.sign(channel.offset_hz) * guard / 2,
                bandwidth_hz=width - guard,
            )
            for channel in neighbours
        ]
        ratios.append(
            [
                10 ** (-item.ratio_db / 10) * width / (width - guard)
                for item in aclr(
                    found,
                    carrier=MeasuredChannel(offset_hz=0.0, bandwidth_hz=width + guard),
                    neighbours=inner,
                ).ratios
            ]
        )
    mean = -10 * np.log10(np.mean(ratios, axis=0))
    assert mean[:2].mean() == pytest.approx(first_db, abs=tolerance)
    assert mean[2:].mean() == pytest.approx(second_db, abs=tolerance)


def ofdm(n_active, n_fft, constellation, n_symbols, prefix="0 samples"):
    half = n_active // 2
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15_000),
        groups=(
            Group(
                subcarriers=IndexSet.parse(f"-{half}..-1, 1..{half}"),
                constellation=Constellation.parse(constellation),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(prefix),
    )
    rate = Fraction(15_000) * n_fft
    length = settings.cycle(rate, "signal").n_samples * n_symbols
    return settings.build(site(rate, length))


@pytest.mark.parametrize("ratio_db", CLIPPED)
def test_clipped_ofdm_in_band_error(ratio_db, stored) -> None:
    """600 subcarriers are Gaussian enough; five standard errors as above, 1 % for the edges."""
    graph = ofdm(600, 4096, "64qam", 120)
    clipped = stored(clip(samples_of(graph), ratio_db), graph.sample_rate_hz)
    (found,) = measure_evm(graph, clipped)
    n_clips = 120 * 600 * np.exp(-(10 ** (ratio_db / 10)))
    tolerance = 0.01 + 5 / np.sqrt(n_clips)
    assert found.percent == pytest.approx(CLIPPED[ratio_db][2], rel=tolerance)


@pytest.fixture
def stored(tmp_path):
    def make(samples, rate):
        path = tmp_path / "samples.cf32"
        np.asarray(samples, np.complex64).tofile(path)
        return Stored(sample_rate_hz=rate, n_samples=samples.size, path=path)

    return make


@pytest.mark.parametrize("snr_db", [10.0, 30.0, 50.0])
def test_white_noise_is_an_evm_of_its_own_ratio(snr_db, stored) -> None:
    """Noise within the band of a subcarrier is the band's share of it: EVM = 1 / sqrt(SNR).

    Tolerance: five standard errors of the mean square of n complex Gaussians, half of it for
    the root.
    """
    rng = np.random.default_rng(1)
    graph = ofdm(200, 1024, "16qam", 80, prefix="64 samples")
    samples = samples_of(graph)
    noise = rng.standard_normal(samples.size) + 1j * rng.standard_normal(samples.size)
    density = 10 ** (-snr_db / 20) * np.sqrt(1024 / 200 / 2)
    noisy = stored(samples + density * noise, graph.sample_rate_hz)
    (found,) = measure_evm(graph, noisy)
    n_points = 200 * 80
    assert found.percent == pytest.approx(
        100 * 10 ** (-snr_db / 20), rel=2.5 / np.sqrt(n_points) + 0.002
    )


@pytest.mark.parametrize("constellation", ["qpsk", "16qam", "256qam"])
@pytest.mark.parametrize("per_symbol", [4, Fraction(10, 3)])
def test_untouched_carriers_beside_each_other(constellation, per_symbol) -> None:
    """EVM below 0.01 % by the default pulse, also beside a neighbour that does not overlap."""
    rate = Fraction(1_000_000)
    settings = SingleCarrier(
        constellation=Constellation.parse(constellation), symbol_rate_hz=rate / per_symbol / 2
    )
    here = site(rate, 40_000)
    parts = tuple(
        Part(signal=settings, frequency_offset_hz=Fraction(offset), level_db=level)
        for offset, level in ((-200_000, 0.0), (200_000, -10.0))
    )
    signals = [settings.build(here.at(name)) for name in ("a", "b")]
    both = Sum(parts=parts).combine(here, signals)
    for found in measure_evm(both):
        assert found.percent < 0.01
        assert found.overall.unfitted_percent < 0.01
        assert "leakage" in found.remarks[0]


@pytest.mark.parametrize("share", [0.99, 0.9])
def test_occupied_bandwidth_of_a_flat_block(share) -> None:
    """ITU-R SM.328: 0.5 % outside each edge; 0.99 of the width of a flat block."""
    rng = np.random.default_rng(2)
    lines = np.zeros(1 << 16, complex)
    place = np.arange(-8000, 8000)
    lines[place] = np.exp(2j * np.pi * rng.random(place.size))
    samples = scipy.fft.ifft(lines).astype(np.complex64)
    found = occupied_bandwidth(spectrum_of(samples, sample_rate_hz=65_536.0), share=share)
    assert found.width_hz == pytest.approx(share * 16_000, abs=65_536 / 4096)


def raw_cubic_metric(signal):
    tap = Tap(name="x", signal=signal, meter=CubicMeter())
    return render(signal, taps=(tap,))["x"]


def test_cubic_metric_anchors(stored) -> None:
    """One tone 0, two equal tones 10 log10 2.5 = 3.979 dB, complex Gaussian 10 log10 6 = 7.7815.

    Tolerance: float32 for tones; for the Gaussian five standard errors of E p^3 over N / 8
    independent samples, whose variance is 720 - 36.
    """
    index = np.arange(4096)
    one = np.exp(2j * np.pi * 5 * index / 4096)
    two = one + np.exp(2j * np.pi * 9 * index / 4096)
    rate = Fraction(1000)
    assert raw_cubic_metric(stored(one, rate)).raw_db == pytest.approx(0, abs=1e-6)
    two_tones = raw_cubic_metric(stored(two, rate)).raw_db
    assert two_tones == pytest.approx(3.9794, abs=1e-4)
    assert two_tones == pytest.approx(10 * np.log10(2.5), abs=1e-5)
    found = raw_cubic_metric(stored(flat_gaussian(3), rate))
    error_db = 10 * np.log10(1 + 5 * np.sqrt(684 / 36 / (N / BAND)))
    assert found.raw_db == pytest.approx(7.7815, abs=error_db)
    assert found.cubic_metric_db() == pytest.approx(4.014, abs=error_db / 1.56)
    assert found.cubic_metric_db(1.85) == pytest.approx(3.385, abs=error_db / 1.85)


@pytest.mark.parametrize(
    ("constellation", "raw_db"), [("qpsk", 2.384), ("16qam", 4.296), ("64qam", 4.671)]
)
def test_cubic_metric_of_shaped_carriers(constellation, raw_db) -> None:
    """RRC 0.22, exact from moments; 0.05 dB is about four standard errors at 2e4 symbols."""
    settings = SingleCarrier(
        constellation=Constellation.parse(constellation), symbol_rate_hz=Fraction(1000)
    )
    found = raw_cubic_metric(settings.build(site(4000, 80_000)))
    assert found.raw_db == pytest.approx(raw_db, abs=0.05)


@pytest.mark.parametrize(("constellation", "raw_db"), [("qpsk", 7.679), ("16qam", 7.712)])
def test_cubic_metric_of_ofdm(constellation, raw_db) -> None:
    """64 subcarriers, 10 log10(6 + 9 k4/N + k6/N^2); tolerance: five standard errors, as above."""
    signal = ofdm(64, 256, constellation, 3000)
    error_db = 10 * np.log10(1 + 5 * np.sqrt(684 / 36 / (64 * 3000)))
    assert raw_cubic_metric(signal).raw_db == pytest.approx(raw_db, abs=error_db)


def test_limits_of_the_standards() -> None:
    """3GPP TS 38.104 v19.4.0 Table 6.5.2.2-1 (confirmed); IEEE 802.11 (two open sources)."""
    for modulation, percent in (("QPSK", 17.5), ("16QAM", 12.5), ("64QAM", 8), ("256QAM", 3.5)):
        assert evm_limit(f"NR BS FR1 {modulation}").percent == percent
    for rate, limit_db in (("QPSK 1/2", -10), ("64QAM 5/6", -27), ("1024QAM 5/6", -35)):
        found = evm_limit(f"IEEE 802.11 {rate}").percent
        assert found == pytest.approx(100 * 10 ** (limit_db / 20), abs=6e-4)
    assert evm_limit("E-UTRA BS 64QAM").status.count("unconfirmed") == 1


def test_all_figures_at_once_are_those_of_each_alone(stored) -> None:
    graph = ofdm(200, 1024, "64qam", 40, prefix="64 samples")
    clipped = stored(clip(samples_of(graph), 5.0), graph.sample_rate_hz)
    found = measure_fidelity(graph, clipped, reference=graph)
    assert found.evm == tuple(measure_evm(graph, clipped, settings=EvmSettings()))
    assert found.cubic == raw_cubic_metric(clipped)
    whole: Signal = clipped
    alone = spectrum_of(samples_of(whole), sample_rate_hz=float(whole.sample_rate_hz))
    assert np.array_equal(found.spectrum.density, alone.density)
    assert found.total.fitted_percent > found.evm[0].percent
