"""Mistakes of the trade in making a stimulus: each test is named after one, with its size.

Numbers in the names are this project's own list, in DEVELOPERS.md. Sizes are derivations unless
a source is named.
"""

from __future__ import annotations

import json
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft

from wavegen.core.render import samples_of
from wavegen.meters.seam import seam_figure
from wavegen.production.make import make
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

HEAD = "wavegen: 1\nsample_rate: 4 MHz\nduration: DURATION\n"
QPSK = "kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz"


def loaded(body: str, duration: str = "2 ms", overrides: tuple[str, ...] = ()):
    return load_text(HEAD.replace("DURATION", duration) + body, name="case", overrides=overrides)


def made(body: str, out, duration: str = "2 ms"):
    return make(loaded(body, duration), out=out)


def codes(path) -> np.ndarray:
    """Return the samples of a complex 16-bit file, full scale 1.0, read with NumPy alone."""
    rails = np.fromfile(path, "<i2").astype(np.float64).reshape(-1, 2) / 32768
    return rails[:, 0] + 1j * rails[:, 1]


def finer(rail: np.ndarray, points: int = 16) -> np.ndarray:
    """Return a loop on 16 points a sample, by padding its spectrum."""
    n = rail.size
    spectrum = scipy.fft.fft(rail)
    padded = np.zeros(points * n, np.complex128)
    padded[: n // 2], padded[-(n // 2) :] = spectrum[: n // 2], spectrum[-(n // 2) :]
    return scipy.fft.ifft(padded) * points


def test_mistake_1_a_seam_where_the_file_loops(tmp_path):
    # Half a cycle left over: a jump of twice the amplitude. Here an offset that does not fit the
    # loop is moved to its grid, and said; the seam is measured; a cut record is told apart.
    body = f"""\
signal:
  kind: sum
  parts:
    - frequency_offset: 100.123 kHz
      signal: {{{QPSK}}}
"""
    document = made(body, tmp_path).document
    moved = next(row for row in document["rounded"] if "frequency_offset" in row["where"])
    assert moved["asked"] != moved["given"]
    assert document["loop"]["seam"]["is_clean"]
    whole = prepare(loaded(f"signal: {{{QPSK}}}\n")).built.signal
    from wavegen.core.excerpt import excerpt

    cut = excerpt(whole, 0, whole.n_samples - 1001)
    clean, broken = (seam_figure(x, cycle_samples=4) for x in (whole, cut))
    assert clean.is_clean
    assert not broken.is_clean
    assert broken.excess_db > 20


def test_mistake_2_over_range_between_samples_that_all_fit(tmp_path):
    # A crest between samples stands up to 20 log10(1 / cos(pi / 2 L)) above them. The peak that
    # is set is the one between samples, of the envelope or of the rails.
    body = f"signal: {{{QPSK}, pulse: {{kind: root_raised_cosine, roll_off: 0.22}}}}\n"
    narrow = body.replace("symbol_rate: 1 MHz", "symbol_rate: 3.2 MHz")
    found = made(narrow + "output: {peak: 0 dBFS}\n", tmp_path / "a")
    fine = finer(codes(found.files[0]))
    samples = np.abs(codes(found.files[0]))
    assert np.abs(fine).max() <= 1.001
    assert np.abs(fine).max() / samples.max() > 1.02
    rail = made(narrow + "output: {peak: 0 dBFS, peak_of: rail}\n", tmp_path / "b")
    fine = finer(codes(rail.files[0]))
    assert max(np.abs(fine.real).max(), np.abs(fine.imag).max()) == pytest.approx(1, abs=1e-3)
    assert rail.document["files"][0]["n_saturated"] == 0


@pytest.mark.parametrize("oversampling", [2, 4, 8])
def test_mistake_2_the_bound_is_never_exceeded(oversampling, tmp_path):
    # Sharif, Gharavi-Alkhansari, Khalaj, IEEE Trans. Commun. 51(1), 2003 (constant from memory).
    body = f"signal: {{kind: noise, bandwidth: {Fraction(4, oversampling) * 9 / 10} MHz}}\n"
    document = made(body, tmp_path, "20 ms").document
    gained = document["papr_between_samples_db"] - document["papr_db"]
    assert 0 <= gained <= -20 * np.log10(np.cos(np.pi / 2 / oversampling))


def test_mistake_3_what_full_scale_means(tmp_path):
    # RMS sine, envelope or rail at 0 dBFS: 3.01 dB apart. It is said, and both figures stand there.
    document = made("signal: {kind: carrier}\noutput: {peak: -3 dBFS}\n", tmp_path).document
    assert "envelope" in document["full_scale"]
    assert document["mean_dbfs"] == pytest.approx(-3, abs=1e-3)
    assert document["peak_dbfs"] == pytest.approx(-3, abs=1e-3)
    assert document["scaling"]["i_peak_dbfs"] == pytest.approx(-3, abs=1e-3)
    found = codes(tmp_path / "case" / "case.sigmf-data")
    assert np.abs(found).max() == pytest.approx(10 ** (-3 / 20), rel=1e-4)


def test_mistake_4_envelope_and_passband_are_not_3_db_apart(tmp_path):
    # Only the peak moves by 3.01 dB; a Gaussian level at 1e-4 moves by 2.16 dB. What a figure is
    # of is said beside it, and no flat 3 dB is added anywhere.
    document = made("signal: {kind: carrier}\n", tmp_path).document
    assert "complex envelope" in document["papr_is"]
    assert document["papr_db"] == pytest.approx(0, abs=1e-3)


def test_mistake_5_papr_from_samples_at_the_nyquist_rate(tmp_path):
    # On average 0.66 dB low, up to 4 dB (random OFDM). Both figures stand there; the one between
    # samples agrees with 16 points a sample.
    body = "signal: {kind: noise, bandwidth: 3.6 MHz}\n"
    document = made(body, tmp_path, "10 ms").document
    fine = np.abs(finer(codes(tmp_path / "case" / "case.sigmf-data"))) ** 2
    papr = 10 * np.log10(fine.max() / fine.mean())
    assert document["papr_between_samples_db"] == pytest.approx(papr, abs=0.02)
    assert document["papr_between_samples_db"] > document["papr_db"] + 0.05


@pytest.mark.parametrize(("duty", "db"), [(50, 3.01), (25, 6.02), (12.5, 9.03)])
def test_mistake_8_mean_over_the_burst_or_over_everything(duty, db, tmp_path):
    # 10 log10(1 / duty): 3.01, 6.02, 9.03 dB. Both means are stored, by name.
    gate = f"stages: [{{kind: gate, duty: {duty} %, period: 0.5 ms}}]\n"
    document = made("signal: {kind: carrier}\n" + gate, tmp_path).document
    assert document["on_time"]["mean_dbfs"] - document["mean_dbfs"] == pytest.approx(db, abs=0.01)
    assert document["on_time"]["duty"] == duty / 100


def test_mistake_17_truncation_instead_of_rounding(tmp_path):
    # Truncation puts half a code of DC on each rail; rounding leaves none, and its noise is told.
    body = "signal: {kind: noise, bandwidth: 1 MHz}\noutput: {average: -30 dBFS, iq: [FILES]}\n"
    files = "{format: raw, datatype: ci8}, {format: raw, datatype: cf32_le, name: exact}"
    found = made(body.replace("FILES", files), tmp_path, "50 ms")
    rounded = np.fromfile(found.files[0], np.int8).astype(np.float64) / 128
    exact = np.fromfile(found.files[1], np.float32).astype(np.float64)
    error = rounded - exact
    n = error.size
    assert abs(error.mean()) < 4 / 128 / np.sqrt(12 * n)
    told = found.document["files"][0]["rounding_noise_dbc"]
    power = 2 * np.mean(error**2) / (2 * np.mean(exact**2))
    assert told == pytest.approx(10 * np.log10(power), abs=0.3)
    assert found.document["files"][1]["rounding_noise_dbc"] is None


def test_mistake_18_equal_tones_taken_for_the_random_phase_law(tmp_path):
    # 64 equal tones at 0.1 %: the ensemble says 8.3 dB; Newman phases stand at 2.6, in phase 18.1.
    tones = "signal: {kind: tones, count: 64, spacing: 31.25 kHz, phases: PHASES}\n"
    for phases, level in (("newman", 2.6), ("equal", 18.06)):
        document = made(tones.replace("PHASES", phases), tmp_path / phases, "64 ms").document
        law = {row["probability"]: row["level_db"] for row in document["law"]["levels"]}
        assert document["law"]["verdict"] == "agrees"
        assert document["law"]["holds"] == "every loop"
        assert law[1e-3] == pytest.approx(level, abs=0.1)


def test_mistake_20_a_pattern_too_short(tmp_path):
    # A loop that cuts its pattern, or is shorter than it, does not hold its rare runs.
    body = f"signal: {{{QPSK}, data: {{kind: prbs, sequence: pn15}}}}\n"
    document = made(body, tmp_path).document
    assert any("period" in row["text"] for row in document["warnings"])
    whole = made(body, tmp_path / "whole", "2 PRBS periods").document
    (row,) = whole["warnings"]  # whole, but too short for 0.01 %: 10 / 32767 is 0.0305 %
    assert "0.0305 %" in row["text"]
    assert whole["n_samples"] == 4 * 32767


def test_mistake_21_one_seed_for_all_carriers():
    # Carriers that share data add as amplitudes: up to 10 log10 N on top.
    def parts(data: str) -> np.ndarray:
        body = f"""\
signal:
  kind: sum
  parts:
    - {{name: one, signal: {{{QPSK}}}}}
    - {{name: two, frequency_offset: 1.5 MHz, signal: {{{QPSK}{data}}}}}
"""
        built = prepare(loaded(body, "20 ms")).built
        return np.stack([samples_of(part.signal) for part in built.parts])

    def correlation(pair: np.ndarray) -> float:
        return float(abs(np.vdot(pair[0], pair[1])) / np.prod(np.linalg.norm(pair, axis=1)))

    n_symbols = 20_000
    assert correlation(parts("")) < 4 / np.sqrt(n_symbols)
    assert correlation(parts(", data: {share: one}")) > 0.999


def test_mistake_22_a_mean_that_the_clip_moved(tmp_path):
    # 0.37 dB at a 4 dB clip of a Gaussian-like signal. It is undone, and said; the ceiling is over
    # the mean of what comes out.
    body = "signal: {kind: noise, bandwidth: 1 MHz}\nstages: [{kind: clip, ceiling: 4.367 dB}]\n"
    document = made(body, tmp_path, "100 ms").document
    assert document["papr_db"] == pytest.approx(4.367, abs=0.03)
    assert document["mean"]["realised_db"] == pytest.approx(0, abs=0.1)
    note = next(row for row in document["notes"] if "mean power" in row["text"])
    assert "-0.36" in note["text"] or "-0.37" in note["text"]


def test_the_sidecar_says_all_of_it_in_words(tmp_path):
    made("signal: {kind: carrier}\n", tmp_path)
    text = (tmp_path / "case" / "case.ccdf.json").read_text()
    document = json.loads(text)
    assert {"full_scale", "papr_is", "safety"} <= document.keys()
