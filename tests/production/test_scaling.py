from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.production.scaling import gain_for


def waveform(mean, peak):
    statistics = SimpleNamespace(mean=mean, mean_db=10 * np.log10(mean))
    rails = SimpleNamespace(largest=peak / 2)
    return SimpleNamespace(statistics=statistics, peak=SimpleNamespace(power=peak), rails=rails)


def test_gain_by_the_peak(lab):
    loaded = lab.load(lab.CARRIER + "output: {peak: -6 dBFS}\n")
    assert gain_for(loaded, [waveform(1.0, 4.0)]) == pytest.approx(10 ** (-6 / 20) / 2, rel=1e-12)


def test_the_peak_is_minus_one_unless_said(lab):
    gain = gain_for(lab.load(lab.CARRIER), [waveform(1.0, 1.0)])
    assert gain == pytest.approx(10 ** (-1 / 20), rel=1e-12)


def test_gain_by_the_average(lab):
    loaded = lab.load(lab.CARRIER + "output: {average: -15 dBFS}\n")
    assert gain_for(loaded, [waveform(2.0, 8.0)]) == pytest.approx(
        10 ** (-15 / 20) / np.sqrt(2), rel=1e-12
    )


def test_an_average_that_would_put_the_peak_over_full_scale(lab):
    loaded = lab.load(lab.CARRIER + "output: {average: -6 dBFS}\n")
    gain_for(loaded, [waveform(1.0, 10**0.599)])
    with pytest.raises(RecipeError) as caught:
        gain_for(loaded, [waveform(1.0, 10**0.7)])
    assert caught.value.where.startswith("case.yaml:5:")
    assert "1.00 dBFS" in caught.value.problem
    assert "-7.00 dBFS" in caught.value.allowed


def test_of_two_channels_the_larger_peak_and_the_first_average_count(lab):
    both = [waveform(1.0, 2.0), waveform(0.5, 4.0)]
    loaded = lab.load(lab.CARRIER + "output: {peak: -6 dBFS}\n")
    assert gain_for(loaded, both) == pytest.approx(10 ** (-6 / 20) / 2, rel=1e-12)
    assert gain_for(loaded, both[::-1]) == gain_for(loaded, both)
    loaded = lab.load(lab.CARRIER + "output: {peak: -6 dBFS, peak_of: rail}\n")
    assert gain_for(loaded, both) == pytest.approx(10 ** (-6 / 20) / np.sqrt(2), rel=1e-12)
    loaded = lab.load(lab.CARRIER + "output: {average: -7 dBFS}\n")
    assert gain_for(loaded, both) == pytest.approx(10 ** (-7 / 20), rel=1e-12)
    loaded = lab.load(lab.CARRIER + "output: {average: -5 dBFS}\n")
    with pytest.raises(RecipeError, match=r"1\.02 dBFS"):  # 4 over 1 is 6.02 dB
        gain_for(loaded, both)


def test_peak_and_average_are_honoured_in_the_written_codes(lab, tmp_path):
    # Independent reading of the codes; the band fills 0.31 of the rate, so a factor of 16 by FFT
    # reads the peak between samples to -20 log10 cos(pi 0.31 / 32) = 0.004 dB.
    for number, (level, figure) in enumerate([("peak: -2 dBFS", -2.0), ("average: -12 dBFS", -12)]):
        made = lab.make(lab.SINGLE + f"output: {{{level}}}\n", tmp_path / str(number))
        codes = lab.read_ci16(made.files[0])
        if "peak" in level:
            spectrum = np.fft.fft(codes)
            half = codes.size // 2
            padded = np.concatenate([spectrum[:half], np.zeros(15 * codes.size), spectrum[half:]])
            found = 20 * np.log10(np.abs(np.fft.ifft(padded)).max() * 16)
        else:
            found = 10 * np.log10(np.mean(np.abs(codes) ** 2))
        assert found == pytest.approx(figure, abs=0.01)


def test_all_formats_of_a_recipe_have_one_gain(lab, tmp_path):
    text = lab.SINGLE + (
        "output: {iq: [sigmf, {format: wav, datatype: int16}, {format: wav, datatype: float32, "
        "name: precise}, {format: raw, datatype: cf32_le}], average: -12 dBFS}\n"
    )
    made = lab.make(text, tmp_path)
    folder = made.folder
    integers = np.fromfile(folder / "case.sigmf-data", "<i2")
    floats = np.fromfile(folder / "case.cf32_le", "<f4")
    assert np.array_equal(np.rint(floats * np.float32(32768)), integers)
    assert (folder / "case.wav").read_bytes().endswith(integers.tobytes())
    assert floats.tobytes() in (folder / "precise.wav").read_bytes()
    means = [item["mean_dbfs"] for item in made.document["files"]]
    assert means == pytest.approx([-12.0] * 4, abs=0.01)
