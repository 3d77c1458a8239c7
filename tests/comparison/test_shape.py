"""Stimuli in the shape of a field signal."""

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
import soundfile

from wavegen.comparison.shape import ShapeSettings, shape
from wavegen.comparison.side import SideSettings
from wavegen.core.errors import ArgumentsError, FileError, SignalError
from wavegen.core.timespan import TimeSpan
from wavegen.files.format import ReadHints
from wavegen.production.measure_settings import GateSettings
from wavegen.recipe.load import load_recipe

N = 1 << 15
RATE = Fraction(1_000_000)


def clipped(seed=3, n=N):
    """A field signal of ours: noise in 30 % of the rate, clipped, and filtered again."""
    rng = np.random.default_rng(seed)
    band = np.abs(np.fft.fftfreq(n)) < 0.15
    spectrum = band * (rng.standard_normal(n) + 1j * rng.standard_normal(n))
    x = np.fft.ifft(spectrum)
    x /= np.sqrt(np.mean(np.abs(x) ** 2))
    x /= np.maximum(np.abs(x) / 10 ** (4 / 20), 1)
    x = np.fft.ifft(np.fft.fft(x) * band)
    return 0.1 * x / np.sqrt(np.mean(np.abs(x) ** 2))


def written(path: Path, samples) -> SideSettings:
    codes = np.rint(np.stack([samples.real, samples.imag], 1) * 32768).astype("<i2")
    codes.tofile(path)
    return SideSettings(
        subject=str(path),
        hints=ReadHints(format="ci16_le", sample_rate_hz=RATE),
        removes_offset=True,
    )


def settings(**more) -> ShapeSettings:
    short = TimeSpan(Fraction(N), "samples")
    return ShapeSettings(**({"name": "twin", "title": "A twin", "duration": short} | more))


def test_levels_and_spectrum_are_followed(tmp_path):
    field = written(tmp_path / "field.ci16", clipped())
    document = shape(field, settings(), out=tmp_path / "out")
    assert document["verdict"] == "match"
    assert document["largest_difference_db"] < 0.05
    # forty bands of ten bins, 32 independent segments: one in forty is off by three sigma, 0.7 dB
    assert abs(document["spectrum"]["largest_difference_db"]) < 1
    assert document["gate"] is None
    folder = tmp_path / "out" / "twin"
    names = {path.name for path in folder.iterdir()}
    assert {"twin.yaml", "twin.curve.csv", "twin.spectrum.csv", "twin.ccdf.json"} <= names
    made = np.fromfile(folder / "twin.sigmf-data", "<i2").reshape(-1, 2) @ np.array([1, 1j])
    # None of the content, however it is shifted: of 2^15 lags of two independent signals with 30 %
    # of the band the largest correlation is about sqrt(ln(2^15) / (0.3 * 2^15)) = 0.033.
    spectra = np.fft.fft(made), np.fft.fft(clipped())
    shifted = np.abs(np.fft.ifft(spectra[0] * np.conj(spectra[1])))
    assert shifted.max() < 0.06 * np.linalg.norm(made) * np.linalg.norm(clipped())


def test_the_recipe_makes_it_again(tmp_path):
    shape(written(tmp_path / "field.ci16", clipped()), settings(), out=tmp_path)
    loaded = load_recipe(tmp_path / "twin" / "twin.yaml")
    assert loaded.recipe.title == "A twin"
    assert type(loaded.recipe.signal).__name__ == "Shaped"


def test_an_offset_and_fill_words_are_no_part_of_it(tmp_path):
    samples = clipped() + 0.05
    samples[:4] = -1 - 1j
    document = shape(written(tmp_path / "field.ci16", samples), settings(), out=tmp_path)
    assert document["skipped_samples"] == 4
    clean = shape(written(tmp_path / "clean.ci16", clipped()), settings(name="clean"), out=tmp_path)
    levels = [
        {row["probability"]: row["field_db"] for row in item["levels"]}
        for item in (document, clean)
    ]
    assert levels[0][0.01] == pytest.approx(levels[1][0.01], abs=0.03)


def test_on_times_are_followed_and_gated(tmp_path):
    gate = (np.arange(N) % 4096 < 1024).astype(float)
    field = written(tmp_path / "field.ci16", clipped() * gate)
    gated = SideSettings(subject=field.subject, hints=field.hints, gate=GateSettings(by="level"))
    document = shape(gated, settings(), out=tmp_path / "out")
    assert document["gate"]["period_samples"] == 4096
    assert document["gate"]["duty"] == pytest.approx(0.25, abs=0.02)
    assert document["verdict"] == "match"
    # In the codes themselves: silence between on-times, and on them the field's levels.
    made = np.fromfile(tmp_path / "out" / "twin" / "twin.sigmf-data", "<i2").reshape(-1, 2)
    power = (made.astype(np.float64) ** 2).sum(1)
    own = np.abs(clipped()[gate > 0]) ** 2
    for frame in power.reshape(-1, 4096):
        assert frame[:1024].any()
        assert not frame[1200:].any()
    on = power.reshape(-1, 4096)[:, 40:1000].ravel()
    for share in (0.5, 0.1, 0.01):
        levels = [10 * np.log10(np.quantile(x, 1 - share) / x.mean()) for x in (on, own)]
        assert levels[0] == pytest.approx(levels[1], abs=0.1)  # the ramps are left out roughly


def test_off_times_shaped_as_if_they_were_signal_are_told_of(tmp_path):
    gate = np.where(np.arange(N) % 4096 < 1024, 1, 1e-3)
    field = written(tmp_path / "field.ci16", clipped() * gate)
    document = shape(field, settings(), out=tmp_path / "out")
    assert any("--gate auto" in row["text"] for row in document["warnings"])


def test_real_samples_are_followed_by_their_envelope(tmp_path):
    """A carrier at a quarter of the rate: what is made is its complex envelope, at its rate."""
    turned = clipped() * np.exp(0.5j * np.pi * np.arange(N))
    path = tmp_path / "field.wav"
    soundfile.write(path, turned.real, 48_000, subtype="PCM_24")
    document = shape(SideSettings(subject=str(path), removes_offset=True), settings(), out=tmp_path)
    assert document["verdict"] == "match"
    levels = {row["probability"]: row["field_db"] for row in document["levels"]}
    power = np.abs(clipped()) ** 2
    for share in (0.1, 0.01):
        expected = 10 * np.log10(np.quantile(power, 1 - share) / power.mean())
        assert levels[share] == pytest.approx(expected, abs=0.05)
    # 30 % of 1 MHz in 48 kHz
    assert document["spectrum"]["occupied_bandwidth_hz"] == pytest.approx(0.3 * 48e3, rel=0.02)


def test_a_curve_needs_a_bandwidth_and_a_rate(tmp_path):
    level = np.arange(-20, 10, 0.1)
    rows = "\n".join(f"{x:.2f},{np.exp(-(10 ** (x / 10))):.8g}" for x in level)
    path = tmp_path / "curve.csv"
    path.write_text(f"# n_samples: 100000\nlevel_db,ccdf\n{rows}\n")
    bare = SideSettings(subject=str(path))
    with pytest.raises(ArgumentsError) as caught:
        shape(bare, settings(bandwidth_hz=Fraction(300_000)), out=tmp_path / "out")
    assert "--sample-rate" in caught.value.where
    document = shape(
        bare,
        settings(bandwidth_hz=Fraction(300_000), sample_rate_hz=RATE),
        out=tmp_path / "out",
    )
    assert document["verdict"] == "match"
    assert document["spectrum"]["is_over"] == "a flat one"
    # forty bands of 245 lines of the loop each, whose amplitudes are set, less the window's reach
    assert abs(document["spectrum"]["largest_difference_db"]) < 0.5


def test_what_no_signal_has_ends_at_the_nearest(tmp_path):
    steady = 0.3 * np.exp(2j * np.pi * 0.11 * np.arange(N))
    field = written(tmp_path / "field.ci16", steady)
    document = shape(field, settings(bandwidth_hz=Fraction(300_000)), out=tmp_path / "out")
    assert document["verdict"] == "differ"
    assert document["largest_difference_db"] > 0.05
    assert (tmp_path / "out" / "twin" / "twin.sigmf-data").exists()


def test_a_constant_envelope_ends_at_the_nearest_too(tmp_path):
    """Exactly constant: its curve is a step, which no flat band of 300 kHz can have."""
    path = tmp_path / "gmsk.yaml"
    path.write_text(
        "wavegen: 1\nsample_rate: 1 MHz\nduration: 8192 samples\n"
        "signal: {kind: phase_modulation, scheme: gmsk, bt: 0.3, symbol_rate: 125 kHz}\n"
    )
    field = SideSettings(subject=str(path), is_recipe=True)
    flat = settings(bandwidth_hz=Fraction(300_000), duration=TimeSpan(Fraction(8192), "samples"))
    document = shape(field, flat, out=tmp_path / "out")
    assert document["verdict"] == "differ"
    assert 0.05 < document["largest_difference_db"] < 5
    assert any("was not found" in row["text"] for row in document["warnings"])


def test_a_carrier_without_its_offset_is_nothing(tmp_path):
    field = written(tmp_path / "field.ci16", np.full(4096, 0.25 + 0j))
    with pytest.raises(SignalError) as caught:
        shape(field, settings(), out=tmp_path / "out")
    assert "--keep-dc" in caught.value.remedy
    # Bursts that are not found are another matter.
    field = replace(written(tmp_path / "on.ci16", clipped()), gate=GateSettings(by="level"))
    with pytest.raises(SignalError, match="no bursts") as caught:
        shape(field, settings(), out=tmp_path / "out")
    assert "--keep-dc" not in caught.value.remedy


def test_a_band_wider_than_the_rate_is_refused_before_anything_is_written(tmp_path):
    field = written(tmp_path / "field.ci16", clipped())
    with pytest.raises(ArgumentsError) as caught:
        shape(field, settings(bandwidth_hz=Fraction(980_000)), out=tmp_path / "out")
    assert caught.value.where == "--bandwidth"
    assert "952.4 kHz" in caught.value.allowed
    assert not (tmp_path / "out").exists()


def test_nothing_that_exists_is_lost_and_nothing_is_left(tmp_path):
    field = written(tmp_path / "field.ci16", clipped())
    folder = tmp_path / "out" / "twin"
    folder.mkdir(parents=True)
    (folder / "twin.sigmf-data").write_text("mine")
    with pytest.raises(FileError):
        shape(field, settings(), out=tmp_path / "out")
    assert [path.name for path in folder.iterdir()] == ["twin.sigmf-data"]
    assert (folder / "twin.sigmf-data").read_text() == "mine"
