"""Power against time: dBm come out as they went in."""

import pickle
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording

RATE = Fraction(1_000_000)
DBM = np.array([-30.0, -10.5, 0.0, 13.25])
MW = 10 ** (DBM / 10)


def opened(folder, heading, figures, hints=None):
    path = folder / "x.csv"
    path.write_text(heading + "\n" + "\n".join(figures) + "\n", encoding="utf-8")
    return open_recording(path, hints or ReadHints(sample_rate_hz=RATE))


@pytest.mark.parametrize(
    ("heading", "figures"),
    [
        ("power_dbm", [f"{item}" for item in DBM]),
        ("Power [dBm]", [f"{item}".replace(".", ",") for item in DBM]),
        ("dBm", [f"{item}" for item in DBM]),
        ("power_mw", [f"{item:.17g}" for item in MW]),
        ("Power (W)", [f"{item / 1000:.17g}" for item in MW]),
        ("P / uW", [f"{item * 1000:.17g}" for item in MW]),
        ("index,Level [dBm]", [f"{n},{item}" for n, item in enumerate(DBM)]),
    ],
)
def test_levels_come_out_right(tmp_path, heading, figures):
    recording = opened(tmp_path, heading, figures)
    assert recording.is_power
    assert not recording.is_real
    signal = pickle.loads(pickle.dumps(recording.signal))  # noqa: S301 (our own bytes)
    samples = signal.compute(0, 4)
    assert not samples.imag.any()
    level = 20 * np.log10(np.abs(samples).astype(float)) + recording.reference_level_dbm
    np.testing.assert_allclose(level, DBM, atol=1e-5)  # float32 amplitudes: 5e-7 dB and rounding


def test_relative_power_takes_the_reference_that_is_told(tmp_path):
    hints = ReadHints(sample_rate_hz=RATE, reference_level_dbm=-20)
    recording = opened(tmp_path, "power_db", ["-3", "0"], hints)
    assert recording.reference_level_dbm == -20
    np.testing.assert_allclose(np.abs(recording.signal.compute(0, 2)) ** 2, [10**-0.3, 1])


def test_the_rate_is_taken_from_the_times(tmp_path):
    rows = [f"{n * 0.05:.2f};-{n},5" for n in range(10)]
    rows = [row.replace(".", ",") for row in rows]
    recording = opened(tmp_path, "Time (µs);Power (dBm)", rows, ReadHints())
    assert recording.sample_rate_hz == 20_000_000
    assert "20 MHz" in recording.warnings[0]
    told = opened(tmp_path, "Time (µs);Power (dBm)", rows)
    assert (told.sample_rate_hz, told.warnings) == (RATE, ())


@pytest.mark.parametrize(
    ("heading", "figures", "hints", "word"),
    [
        ("power_w", ["1", "-1"], None, "row 2"),
        ("power_dbm", ["1", "1000"], None, "1000"),
        ("power_dbm", ["1", "-inf"], None, "-inf"),
        ("power_dbm", ["1"], ReadHints(), "rate"),
        ("power_dbm", ["1"], ReadHints(sample_rate_hz=RATE, full_scale=2.0), "no codes"),
        ("power_dbm", ["1"], ReadHints(sample_rate_hz=RATE, reference_level_dbm=0.0), "again"),
        ("time_s,power_dbm", ["0,1", "1,1", "5,1"], ReadHints(), "evenly"),
        ("time_s,power_dbm", ["1,1", "0,1"], ReadHints(), "evenly"),
        ("voltage [V]", ["1", "2"], None, "voltage (V)"),
        ("power_MW", ["1", "2"], None, "MW"),
        ("MW", ["1", "2"], None, "MW"),
        ("Power [MW]", ["1", "2"], None, "MW"),
    ],
)
def test_what_is_refused(tmp_path, heading, figures, hints, word):
    with pytest.raises(FileError) as caught:  # noqa: PT012 (rows are seen when they are read)
        recording = opened(tmp_path, heading, figures, hints)
        recording.signal.compute(0, recording.n_samples)
    assert word in caught.value.problem
    assert caught.value.remedy
