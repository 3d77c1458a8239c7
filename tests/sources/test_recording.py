"""Recordings as sources."""

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.held import Held
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.core.units import format_hz
from wavegen.laws.term import NoLaw
from wavegen.meters.seam import seam_figure
from wavegen.sources.recording import Recording, best_cut

RATE = Fraction(1_000_000)


def noise(n, seed=1, width=0.3):
    rng = np.random.default_rng(seed)
    spectrum = (rng.standard_normal(n) + 1j * rng.standard_normal(n)) * (
        np.abs(np.fft.fftfreq(n)) < width / 2
    )
    x = np.fft.ifft(spectrum)
    return (0.2 * x / np.sqrt(np.mean(np.abs(x) ** 2))).astype(np.complex64)


@pytest.fixture
def site(tmp_path: Path) -> Site:
    return Site(
        sample_rate_hz=RATE, n_samples=10_000, seed=1, label="s", path="signal", folder=tmp_path
    )


def written(folder: Path, samples) -> Recording:
    np.asarray(samples, np.complex64).tofile(folder / "field.cf32")
    return Recording(path="field.cf32", format="cf32_le", sample_rate_hz=RATE)


def test_a_loop_that_closes_with_unit_power(site, tmp_path):
    signal = written(tmp_path, noise(50_000)).build(site)
    samples = samples_of(signal)
    assert samples.size == 10_000
    assert np.mean(np.abs(samples) ** 2) == pytest.approx(1, rel=1e-5)
    assert seam_figure(signal).is_clean
    (note,) = site.notes
    assert "Levels of the CCDF move by up to" in note.text
    assert "Its spectrum moves by up to" in note.text
    assert "dBc become -" in note.text  # nothing is heard beside it


def test_all_but_the_fade_is_the_recording(site, tmp_path):
    field = noise(10_100)
    settings = replace(written(tmp_path, field), cross_fade_s=Fraction(100, 10**6))
    samples = samples_of(settings.build(site))
    ratio = samples[:9_900] / field[100:10_000]
    assert np.ptp(ratio.real) < 1e-4
    assert abs(samples[-1] / ratio[0] - field[99]) < 0.02  # almost only what led up to the start


def test_a_repeating_frame_is_cut_at_its_period():
    frame = noise(5_000)
    source = Held(
        sample_rate_hz=RATE,
        n_samples=23_000,
        samples=np.concatenate([noise(3_000, 2), np.tile(frame, 4)]),
        mean_power=None,
    )
    start, likeness = best_cut(source, 0, 23_000, 10_000, 100)
    assert likeness == pytest.approx(1, abs=1e-6)
    assert start >= 3_100


def test_direct_current_goes_only_when_asked(site, tmp_path):
    settings = written(tmp_path, noise(20_000) + 0.1)
    kept = samples_of(settings.build(site))
    removed = samples_of(replace(settings, remove_dc=True).build(site))
    assert abs(kept.mean()) > 0.3
    assert abs(removed.mean()) < 1e-4
    assert np.mean(np.abs(removed) ** 2) == pytest.approx(1, rel=1e-5)


def test_a_part_of_it(site, tmp_path):
    field = noise(40_000)
    settings = replace(
        written(tmp_path, field), from_s=Fraction(20, 1000), to_s=Fraction(32_500, 10**6)
    )
    samples = samples_of(settings.build(site))
    likeness = np.vdot(samples[:7_400], field[22_500:29_900])
    norm = np.linalg.norm(samples[:7_400]) * np.linalg.norm(field[22_500:29_900])
    assert abs(likeness) / norm == pytest.approx(1, abs=1e-4)


def test_there_is_no_law(site):
    assert isinstance(Recording(path="x").law(site), NoLaw)


@pytest.mark.parametrize(
    ("change", "key", "word"),
    [
        ({"path": "none.cf32"}, "signal.path", "no such file"),
        ({"sample_rate_hz": Fraction(2_000_000)}, "signal.path", "was recorded at"),
        ({"to_s": Fraction(5, 1000)}, "signal.to", "take 10000"),
        ({"from_s": Fraction(1)}, "signal.from", "asks for"),
        ({"cross_fade_s": Fraction(6, 1000)}, "signal.cross_fade", "half of the loop"),
    ],
)
def test_what_cannot_be_used_is_told(site, tmp_path, change, key, word):
    settings = replace(written(tmp_path, noise(20_000)), **change)
    with pytest.raises(RecipeError) as caught:
        settings.build(site)
    assert caught.value.where == key
    assert word in caught.value.problem


def test_another_rate_names_the_stage_that_helps(site, tmp_path):
    settings = replace(written(tmp_path, noise(20_000)), sample_rate_hz=Fraction(1_920_000))
    with pytest.raises(RecipeError) as caught:
        settings.build(site)
    assert f"input_rate: {format_hz(Fraction(1_920_000))}" in caught.value.remedy


def test_silence_is_refused(site, tmp_path):
    with pytest.raises(RecipeError, match="silent"):
        written(tmp_path, np.zeros(20_000)).build(site)
