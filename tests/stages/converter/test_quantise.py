import dataclasses
import math

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.stages.converter.quantise import Quantise, Quantised


def build(bench, source, **fields):
    site = bench.site(source.n_samples)
    return Quantise(**fields).build(site, source), site.notes


def test_codes_are_rounded_half_to_even_and_cut_at_the_ends(bench):
    rails = np.array([0.5, 1.5, 2.5, -0.5, -1.5, 3.49, 7.0, 7.4, -9.0, 60.0, 0.0, 1.0])
    source = bench.given(rails[::2] + 1j * rails[1::2])
    made = Quantised(sample_rate_hz=bench.rate_hz, n_samples=6, inputs=(source,), bits=4, code=1.0)
    want = [0, 2, 2, 0, -2, 3, 7, 7, -8, 7, 0, 1]
    assert samples_of(made).view(np.float32).tolist() == want


def test_what_is_cut_is_told(bench):
    source = bench.given([1.0, 1.0j, 0.5, -0.5j])  # RMS envelope sqrt(5/8)
    full_scale_db = 20 * math.log10(0.75 / math.sqrt(5 / 8))
    signal, notes = build(bench, source, bits=4, full_scale_db=full_scale_db)
    assert notes[0].kind == "warning"
    assert "0.25 of the codes are cut" in notes[0].text
    assert np.abs(samples_of(signal)).max() == pytest.approx(0.75 * 7 / 8)


def test_what_is_told(bench):
    signal, notes = build(bench, bench.gaussian(50_000), bits=12, full_scale_db=15.0)
    assert f"{6.0206 * 12 + 1.7609 - 15:.2f} dB below the mean; 0 of the codes" in notes[0].text
    assert notes[0].kind == "info"
    assert signal.mean_power is None


def test_twice_is_once(bench):
    signal, _ = build(bench, bench.gaussian(1000), bits=6)
    twice = dataclasses.replace(signal, inputs=(signal,))
    assert samples_of(twice).tobytes() == samples_of(signal).tobytes()


def test_silence_is_refused(bench):
    with pytest.raises(RecipeError):
        build(bench, bench.given([0, 0]))
