"""Behind an amplifier: as much power as the limits allow, against a simulation of its own."""

import csv
import math

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from wavegen.core.render import samples_of
from wavegen.production.fidelity import FidelityRequest
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.device.measured_amplifier import read_amplifier
from wavegen.tuning.amplified_rig import AmplifiedRig
from wavegen.tuning.limits import Limits
from wavegen.tuning.rig import set_up
from wavegen.tuning.search import Goal
from wavegen.tuning.space import space_of

LIMITS = Limits(evm_percent=5.0)
N_FFT, PREFIX, N_USED = 512, 36, 36


@pytest.fixture(scope="module")
def points(tmp_path_factory):
    """A Rapp amplifier of 30 dB gain, saturating at 0 dBm, with 8 degrees of AM/PM."""
    path = tmp_path_factory.mktemp("amplifier") / "points.csv"
    with path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(["input_dbm", "output_dbm", "phase_deg"])
        for level in np.arange(-30, 12.01, 1.0):
            square = 10 ** (level / 10)
            gain = -5 * math.log10(1 + square**2)
            writer.writerow([level, level + 30 + gain, 8 * square / (1 + square)])
    return path


def by_hand(text, points, input_dbm):
    """Output power, dBm, and EVM, percent, by NumPy and SciPy alone."""
    samples = samples_of(prepare(load_text(text)).built.signal).astype(np.complex128)
    clean = samples_of(prepare(load_text(text.partition("stages:")[0])).built.signal).astype(
        np.complex128
    )
    x, y, phase = np.loadtxt(points, delimiter=",", skiprows=1).T
    driven = samples * 10 ** (input_dbm / 20) / np.sqrt(np.mean(np.abs(samples) ** 2))
    level = np.clip(20 * np.log10(np.maximum(np.abs(driven), 1e-9)), x[0], x[-1])
    gain = 10 ** ((PchipInterpolator(x, y)(level) - level) / 20)
    out = driven * gain * np.exp(1j * np.deg2rad(PchipInterpolator(x, phase)(level)))

    def symbols(wave):
        rows = wave.reshape(-1, N_FFT + PREFIX)[:, PREFIX // 2 :][:, :N_FFT]
        bins = np.fft.fft(rows, axis=1)
        return bins[:, np.r_[1 : N_USED + 1, -N_USED:0]]

    sent, got = symbols(clean), symbols(out)
    factor = np.vdot(sent, got) / np.vdot(sent, sent)
    error = np.linalg.norm(got / factor - sent) / np.linalg.norm(sent)
    return 10 * np.log10(np.mean(np.abs(out) ** 2)), 100 * error


@pytest.fixture(scope="module")
def pair(points, tmp_path_factory):
    text = CELL
    folder = tmp_path_factory.mktemp("scratch")
    with set_up(
        load_text(text), FidelityRequest(), place=(0, False), probability=1e-3, folder=folder
    ) as rig:
        bench = AmplifiedRig(
            rig=rig,
            amplifier=read_amplifier(points),
            limits=LIMITS,
            goal=Goal(),
            folder=folder,
        )
        space = space_of("clip_filter", None, band_hz=1e6, highest_db=11.0)
        yield bench, bench.untouched(), bench.try_out(space, ClipFilter(ceiling_db=7.0))


CELL = """wavegen: 1
seed: 5
sample_rate: 7.68 MHz
duration: 70 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-36..-1, 1..36", constellation: 64qam}
  cyclic_prefix: 36/512
"""


def test_the_limit_is_met_as_nearly_as_asked(pair):
    for found in pair[1:]:
        assert 0.05 <= LIMITS.margin_db(found) <= 0.11


def test_power_and_its_rise_by_an_independent_simulation(pair, points):
    _, before, after = pair
    clipped = CELL + "stages: [{kind: clip_filter, ceiling: 7 dB}]\n"
    power_before, evm_before = by_hand(CELL + "stages: []", points, before.input_dbm)
    power_after, evm_after = by_hand(clipped, points, after.input_dbm)
    # pieces between points 1 dB apart differ by less than a thousandth of a dB
    assert before.output_dbm == pytest.approx(power_before, abs=0.005)
    assert after.output_dbm == pytest.approx(power_after, abs=0.005)
    assert before.evm_percent == pytest.approx(evm_before, abs=0.02)
    assert after.evm_percent == pytest.approx(evm_after, abs=0.02)
    assert after.output_dbm - before.output_dbm == pytest.approx(
        power_after - power_before, abs=0.01
    )


def test_levels_are_those_of_the_stimulus(pair):
    _, before, after = pair
    assert after.peak_db < before.peak_db - 2
    assert after.cost == -after.output_dbm


def test_limits_that_no_drive_keeps(pair):
    bench = pair[0]
    space = space_of("clip_filter", None, band_hz=1e6, highest_db=11.0)
    found = bench.try_out(space, ClipFilter(ceiling_db=3.0))
    assert LIMITS.margin_db(found) < 0
    assert found.input_dbm < -20, "the lowest drive is the nearest"


def test_settings_and_drive_on_other_data(pair):
    bench, _, after = pair
    got, figures = bench.repeat(after, ClipFilter(ceiling_db=7.0))
    assert got == after
    assert figures.peak_db == pytest.approx(after.peak_db, abs=1e-4)
