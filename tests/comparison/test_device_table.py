from dataclasses import replace

import numpy as np
import pytest

from wavegen.comparison.device_gain import device_gain
from wavegen.comparison.device_table import device_table, write_device
from wavegen.core.errors import FileError
from wavegen.stages.device.measured_amplifier import read_amplifier


@pytest.fixture
def gain(side, noise, rapp):
    samples = noise(1 << 16) * 0.4
    sides = side(samples, level_dbm=0.0), side(10 * rapp(samples), level_dbm=0.0)
    return device_gain(sides, None, tolerance_db=0.2, down_to=1e-3)


def table_of(gain, **settings):
    return device_table(
        gain.points,
        gain.small,
        gain.fit,
        gain.alignment,
        mean_db=gain.means_db[0],
        peak_db=gain.source.peak_db,
        **settings,
    )


@pytest.mark.parametrize("by_fit", [False, True])
def test_the_stage_reads_what_was_written(gain, tmp_path, by_fit):
    path = tmp_path / "device.csv"
    write_device(table_of(gain, by_fit=by_fit), path, is_absolute=True, has_phase=True)
    amplifier = read_amplifier(path)
    amplitude = np.array([0.03, 0.3, 1.0, 1.3])
    true = 10 / (1 + amplitude**4) ** 0.25
    # Read between bins of a histogram, and between rows half a dB apart.
    assert np.abs(amplifier.gain(amplitude)) == pytest.approx(true, rel=0.01)
    assert 20 * np.log10(amplifier.largest) > gain.source.peak_db + 2.5
    text = path.read_text()
    assert "extrapolated" in text
    assert "not known" not in text


def test_the_phase_stands_at_its_level_whatever_the_scale(side, noise):
    """Levels in dBm, samples in parts of full scale: the turn is looked up over the mean."""
    samples = noise(1 << 16) * 0.4
    turned = samples * np.exp(0.5j * np.abs(samples) ** 2)  # 0.5 rad at a power of 1
    for level_dbm in (None, -37.0):
        sides = side(samples, level_dbm=level_dbm), side(turned, level_dbm=level_dbm)
        found = device_gain(sides, None, tolerance_db=0.2, down_to=1e-3)
        table = table_of(found, by_fit=False)
        over = table.input_dbm - found.means_db[0]
        mean = float(np.mean(np.abs(samples) ** 2))
        used = (over > -10) & (over < 7)
        expected = np.rad2deg(0.5 * mean * 10 ** (over[used] / 10))
        # In bins half a dB wide, from the turn in the lowest of them.
        assert table.phase_deg[used] == pytest.approx(expected, rel=0.06, abs=0.2)


def test_rows_rise(gain):
    for by_fit in (False, True):
        table = table_of(gain, by_fit=by_fit)
        assert (np.diff(table.input_dbm) > 0).all()
        assert (np.diff(table.output_dbm) >= 0).all()
        assert table.is_fit == by_fit


def test_rows_rise_where_the_gain_at_low_levels_is_unsure(gain):
    off = replace(gain.small, gain_db=gain.small.gain_db + 6)
    table = table_of(replace(gain, small=off), by_fit=False)
    assert (np.diff(table.output_dbm) >= 0).all()


def test_what_is_relative_says_so_and_files_are_kept(gain, tmp_path):
    path = tmp_path / "device.csv"
    write_device(table_of(gain, by_fit=False), path, is_absolute=False, has_phase=False)
    text = path.read_text()
    assert "0 dBm stands for the mean input" in text
    assert "phase is not known" in text
    with pytest.raises(FileError):
        write_device(table_of(gain, by_fit=True), path, is_absolute=True, has_phase=True)
    assert path.read_text() == text
    write_device(
        table_of(gain, by_fit=True), path, is_absolute=True, has_phase=True, overwrite=True
    )
    assert path.read_text() != text
