from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
import scipy.interpolate

from wavegen.core.errors import FileError, RecipeError
from wavegen.core.render import samples_of
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import NoLaw
from wavegen.stages.converter.path_response import PathResponse, read_path

TABLE = Path(__file__).with_name("data") / "path.csv"
N = 4000
LINES = np.array([-1750, -1000, -40, 0, 333, 1000, 1790])


def sent(bench, settings, source=None, lines=LINES):
    place = np.arange(N) / N
    source = source or bench.given(
        sum(np.exp(2j * np.pi * line * place) for line in lines).tolist()
    )
    site = bench.site(N)
    signal = settings.build(site, source)
    return signal, np.fft.fft(samples_of(signal).astype(np.complex128))[lines] / N, site.notes


def test_the_path_is_applied_but_for_its_mean_delay(bench):
    """The mean delay is that of a least-squares line through all phases."""
    signal, got, notes = sent(bench, PathResponse(path=str(TABLE)))
    khz, magnitude, phase = np.loadtxt(TABLE, delimiter=",", skiprows=2).T
    turned = np.unwrap(np.deg2rad(phase))
    rest = turned - np.polyfit(khz, turned, 1)[0] * khz
    at = LINES / N * 1000
    size = 10 ** (scipy.interpolate.PchipInterpolator(khz, magnitude)(at) / 20)
    want = size * np.exp(1j * scipy.interpolate.PchipInterpolator(khz, rest)(at))
    np.testing.assert_allclose(got, want, rtol=2e-4)
    assert "2.5" in notes[0].text.split("mean delay, ")[1][:4]
    assert signal.mean_power is None


def test_corrected_and_sent_is_as_before(bench):
    corrected, _, _ = sent(bench, PathResponse(path=str(TABLE), inverse=True))
    _, got, _ = sent(bench, PathResponse(path=str(TABLE)), source=corrected)
    np.testing.assert_allclose(got, 1.0, atol=5e-4)


def test_the_centre_moves_the_table(bench):
    _, one, _ = sent(bench, PathResponse(path=str(TABLE)))
    _, two, _ = sent(
        bench, PathResponse(path=str(TABLE), centre_hz=Fraction(-200_000)), lines=np.array([800])
    )
    assert abs(two[0]) == pytest.approx(abs(one[3]), rel=3e-4)


def test_power_beyond_the_table_is_warned_of(bench):
    kinds = [note.kind for note in sent(bench, PathResponse(path=str(TABLE)))[2]]
    assert kinds == ["info", "info"]
    _, _, notes = sent(bench, PathResponse(path=str(TABLE)), lines=np.array([0, 1900]))
    assert notes[1].kind == "warning"
    assert "0.5 of the power" in notes[1].text


def test_a_table_elsewhere_is_refused(bench):
    with pytest.raises(RecipeError) as caught:
        sent(bench, PathResponse(path=str(TABLE), centre_hz=Fraction(10**9)))
    assert caught.value.where == "stages[0].centre"


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("0,0,0\n0,0,0\n1,0,0\n", "row 2 does not rise"),
        ("0,0,0\n1,300,0\n2,0,0\n", "200 dB"),
        ("0,0,0\n1,0,170\n2,0,20\n3,0,-170\n4,0,0\n", "steps by"),
        ("0,0\n1,0\n2,0\n", "2 columns"),
        ("0,0,0\n1,0,0\n", "2 rows"),
    ],
)
def test_other_tables_are_refused(tmp_path, text, words):
    path = tmp_path / "path.csv"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(FileError) as caught:
        read_path(path, centre_hz=0.0)
    assert words in caught.value.problem


def test_laws(bench):
    settings = PathResponse(path=str(TABLE))
    assert isinstance(settings.law(bench.site(1), GaussianLaw()), GaussianLaw)
    assert isinstance(settings.law(bench.site(1), ConstantLaw()), NoLaw)
