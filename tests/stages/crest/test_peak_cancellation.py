import itertools

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.dsp.band_filter import BandFilter
from wavegen.stages.crest.peak_cancellation import CancellationPass, PeakCancellation, half_lobe

N = 1 << 16


@pytest.fixture(scope="module")
def source(reduction):
    return reduction.banded(N, (-0.1, 0.1, 0))


def test_one_peak_takes_one_pulse(reduction):
    samples = np.ones(400, np.complex64)
    samples[100:103] = [1.5j, 4j, 2j]
    pulse = BandFilter(np.array([0.1, 0.5, 1.0, 0.5, 0.1]))
    signal = CancellationPass(
        sample_rate_hz=reduction.rate_hz,
        n_samples=400,
        step=pulse.hop,
        inputs=(reduction.held(samples),),
        amplitude=1.25,
        pulse=pulse,
        reach=2,
    )
    want = samples.astype(np.complex128)
    want[99:104] -= 2.75j * pulse.taps  # only the highest of three above the threshold counts
    assert np.max(np.abs(samples_of(signal) - want)) < 1e-5


def test_a_lone_peak_comes_down_to_the_ceiling_in_one_pass(reduction, source):
    quiet = 0.1 * source.samples
    kernel = np.zeros(N, np.complex128)
    kernel[np.abs(np.fft.fftfreq(N)) < 0.1] = 1
    pulse = np.fft.ifft(kernel)
    loud = quiet + 3 * np.roll(pulse / pulse[0].real, 5_000)
    signal, _ = reduction.build(PeakCancellation(ceiling_db=20.0, passes=1), reduction.held(loud))
    got = np.abs(samples_of(signal).astype(np.complex128))
    mean = np.mean(got**2)
    assert 10 * np.log10(got[5_000] ** 2 / mean) == pytest.approx(20.0, abs=0.01)


@pytest.mark.parametrize("pulse", ["spectrum", "band"])
def test_passes_bring_the_peak_down_and_leave_the_rest_of_the_band(reduction, source, pulse):
    peaks = []
    for passes in (1, 2, 4, 8):
        signal, _ = reduction.build(
            PeakCancellation(ceiling_db=6.0, passes=passes, pulse=pulse), source
        )
        peaks.append(reduction.papr_db(samples_of(signal)))
        assert reduction.change_dbc(signal, source, [(-0.112, 0.112)]) < -100
    assert all(a > b for a, b in itertools.pairwise(peaks))
    assert 5.99 < peaks[-1] < 6.05


def test_every_carrier_bears_its_share(reduction):
    """With the composite's own spectrum as pulse, distortion over power is alike in both."""
    source = reduction.banded(N, (-0.2, -0.12, 0), (0.05, 0.15, -10))
    shares = {}
    for pulse in ("spectrum", "band"):
        signal, _ = reduction.build(PeakCancellation(ceiling_db=6.0, passes=4, pulse=pulse), source)
        place, change = reduction.change_spectrum(signal, source)
        lines = np.abs(np.fft.fft(source.samples.astype(np.complex128))) ** 2
        ratios = []
        for low, high in ((-0.2, -0.12), (0.05, 0.15)):
            inside = (place >= low) & (place < high)
            ratios.append(change[inside].sum() / lines[inside].sum())
        shares[pulse] = 10 * np.log10(ratios[1] / ratios[0])
    assert abs(shares["spectrum"]) < 1.5
    assert shares["band"] > 6


def test_half_a_lobe():
    lag = np.arange(-40, 41)
    assert half_lobe(BandFilter(np.sinc(lag / 8) * np.hanning(81))) == 4  # zero at 8
    assert half_lobe(BandFilter(np.ones(1))) == 1


def test_notes_tell_passes_and_peaks(reduction, source):
    signal, notes = reduction.build(PeakCancellation(ceiling_db=6.0, passes=3), source)
    (note,) = [note for note in notes if note.where.endswith("ceiling")]
    assert "in 3 passes" in note.text
    assert f"{reduction.papr_db(samples_of(signal)):.2f} dB at the peak" in note.text
    low = PeakCancellation(ceiling_db=reduction.papr_db(source.samples) + 0.01)
    assert reduction.build(low, source)[0] is source
