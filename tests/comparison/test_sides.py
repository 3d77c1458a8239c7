from pathlib import Path

import numpy as np
import pytest

from wavegen.cli.main import run
from wavegen.comparison.curves import ExactCurve, PointsCurve
from wavegen.comparison.side import GENERATED, LAW, LOOP, POINTS, SIDECAR, SideSettings
from wavegen.comparison.sides import open_side
from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.timespan import TimeSpan
from wavegen.files.format import ReadHints
from wavegen.laws.gaussian import GaussianLaw
from wavegen.production.measure_settings import GateSettings
from wavegen.production.subject_files import FilePart

AUTO = GateSettings(by="level")
RECORDINGS = Path(__file__).parents[1] / "files" / "recordings"

GATED = """wavegen: 1
sample_rate: 1 MHz
duration: 64 ms
signal: {kind: noise, bandwidth: 400 kHz}
stages: [{kind: gate, duty: 25 %, period: 1 ms}]
output: {iq: [{format: sigmf, datatype: cf32_le}]}
"""
TONES = """wavegen: 1
sample_rate: 1 MHz
duration: 20 ms
signal: {kind: tones, count: 4, spacing: 10 kHz, phases: newman}
"""


@pytest.fixture
def recipe(tmp_path):
    def recipe(text, name="ferry.yaml"):
        path = tmp_path / name
        path.write_text(text)
        return str(path)

    return recipe


@pytest.fixture
def made(tmp_path, recipe, capsys):
    def made(text):
        assert run(["make", recipe(text), "--out", str(tmp_path / "output")]) == 0
        capsys.readouterr()
        return tmp_path / "output" / "ferry"

    return made


@pytest.fixture
def recorded(tmp_path, noise):
    def recorded(samples=None, name="field.cf32_le", rate_hz=1_000_000):
        path = tmp_path / name
        np.asarray(noise(1 << 15) if samples is None else samples, "<c8").tofile(path)
        return {"subject": str(path), "hints": ReadHints(sample_rate_hz=rate_hz)}

    return recorded


def test_a_file_told_to_loop_is_exact(recorded):
    side = open_side(SideSettings(**recorded(), part=FilePart(loops=True)))
    assert side.is_ == LOOP
    assert side.curve.is_exact
    assert side.mean_low_db == side.mean_db == side.mean_high_db


def test_a_stimulus_by_folder_file_and_sidecar(made):
    folder = made(TONES)
    sides = [
        open_side(SideSettings(subject=str(path)))
        for path in (folder, folder / "ferry.sigmf-data", folder / "ferry.ccdf.json")
    ]
    assert [side.is_.partition(":")[0] for side in sides] == [LOOP, LOOP, SIDECAR]
    assert all(side.curve.is_exact for side in sides)
    # The sidecar's curve has points 0.05 dB apart, and the loop's falls in steps.
    asked = np.array([0.5, 0.1, 0.01])
    assert sides[2].curve.level_db(asked) == pytest.approx(sides[0].curve.level_db(asked), abs=0.05)
    assert sides[2].mean_db == pytest.approx(sides[0].mean_db, abs=1e-3)


def test_a_recipe_is_its_law_or_the_loop_it_makes(recipe):
    text = TONES.replace(
        "tones, count: 4, spacing: 10 kHz, phases: newman", "noise, bandwidth: 400 kHz"
    )
    law = open_side(SideSettings(subject=recipe(text), is_recipe=True))
    assert law.is_.startswith(LAW)
    assert law.curve.level_db(0.01) == pytest.approx(float(GaussianLaw().level_db(0.01)))
    filtered = text + "stages: [{kind: clip, ceiling: 5 dB}, {kind: filter, bandwidth: 420 kHz}]\n"
    side = open_side(
        SideSettings(subject=recipe(filtered), is_recipe=True, overrides=("duration=10 ms",))
    )
    assert side.is_ == GENERATED
    assert isinstance(side.curve, ExactCurve)
    assert any("generated" in text for text in side.warnings)


def test_a_gate_leaves_the_on_time(made, recipe):
    folder = made(GATED)
    whole = open_side(SideSettings(subject=str(folder)))
    assert whole.duty is None
    assert whole.curve.level_db(0.1) == pytest.approx(
        float(GaussianLaw().level_db(0.4)) + 6.02, abs=0.15
    )
    sides = [
        open_side(SideSettings(subject=str(folder), gate=AUTO)),
        open_side(SideSettings(subject=str(folder / "ferry.ccdf.json"), gate=AUTO)),
        open_side(SideSettings(subject=recipe(GATED), is_recipe=True, gate=AUTO)),
    ]
    for side in sides:
        assert side.curve.level_db(0.1) == pytest.approx(
            float(GaussianLaw().level_db(0.1)), abs=0.1
        )
    assert sides[0].duty == pytest.approx(0.25, abs=0.02)  # less a guard at both ends


CURVE = "level_db,ccdf\n" + "".join(
    f"{level:.1f},{float(GaussianLaw().ccdf(level)):.9f}\n" for level in np.arange(-20, 10, 0.5)
)


@pytest.fixture
def curve_file(tmp_path):
    def curve_file(text=CURVE, name="screen.csv"):
        path = tmp_path / name
        path.write_text(text)
        return str(path)

    return curve_file


def test_a_curve_in_csv(curve_file):
    side = open_side(SideSettings(subject=curve_file()))
    assert side.is_ == POINTS
    assert isinstance(side.curve, PointsCurve)
    assert side.signal is None
    assert "unknown" in side.warnings[0]
    assert side.curve.level_db(0.01) == pytest.approx(float(GaussianLaw().level_db(0.01)), abs=0.01)
    counted = open_side(SideSettings(subject=curve_file("# n_samples: 5000\n" + CURVE)))
    assert counted.curve.n_samples == 5000
    told = open_side(SideSettings(subject=curve_file(), curve_samples=7000, reading_db=0.3))
    assert (told.curve.n_samples, told.curve.reading_db) == (7000, 0.3)


def test_a_curve_without_headings_is_told_by_its_format(curve_file):
    path = curve_file(CURVE.partition("\n")[2])
    side = open_side(SideSettings(subject=path, hints=ReadHints(format="curve")))
    assert side.is_ == POINTS


@pytest.mark.parametrize(
    ("change", "word"),
    [
        (lambda text: text.replace("ccdf", "percent"), "mean"),  # a fraction called percent
        (lambda text: "\n".join(text.splitlines()[:4]), "probabilities above 0"),
        (lambda text: text.replace("level_db,ccdf\n", "level_db,ccdf\n-21.0,0.5\n"), "rise"),
    ],
)
def test_curves_that_are_none(curve_file, change, word):
    with pytest.raises(FileError) as caught:
        open_side(SideSettings(subject=curve_file(change(CURVE))))
    assert word in caught.value.problem


@pytest.mark.parametrize(
    "settings",
    [
        {"gate": AUTO},
        {"removes_offset": True},
        {"part": FilePart(loops=True)},
        {"overrides": ("seed=2",)},
    ],
)
def test_settings_that_mean_nothing_for_a_curve(curve_file, settings):
    with pytest.raises(ArgumentsError) as caught:
        open_side(SideSettings(subject=curve_file(), **settings))
    assert caught.value.where.startswith("--")


def test_settings_that_mean_nothing_for_a_recipe(recipe):
    part = FilePart(stop=TimeSpan.parse("1 ms"))
    with pytest.raises(ArgumentsError):
        open_side(SideSettings(subject=recipe(TONES), is_recipe=True, part=part))
    with pytest.raises(ArgumentsError):
        open_side(SideSettings(subject=recipe(TONES), is_recipe=True, hints=ReadHints(channel=1)))


def test_no_such_file(tmp_path):
    with pytest.raises(FileError):
        open_side(SideSettings(subject=str(tmp_path / "none.wav")))
