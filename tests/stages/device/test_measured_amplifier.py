from pathlib import Path

import numpy as np
import pytest
import scipy.interpolate

from wavegen.core.errors import FileError, RecipeError
from wavegen.core.render import samples_of
from wavegen.core.units import QuantityError
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import GaussianTerm, NoLaw
from wavegen.stages.device.measured_amplifier import MeasuredAmplifier, read_amplifier

TABLE = Path(__file__).with_name("data") / "amplifier.csv"
POINTS = np.loadtxt(TABLE, delimiter=",", skiprows=2)


def dbm(amplitude):
    return 20 * np.log10(np.abs(amplitude))


def test_points_are_met_and_between_them_it_is_monotone_cubic():
    gain = read_amplifier(TABLE).gain
    at_dbm = np.linspace(-40, 12, 501)
    amplitude = 10 ** (at_dbm / 20)
    output = amplitude * gain(amplitude)
    want_dbm = scipy.interpolate.PchipInterpolator(POINTS[:, 0], POINTS[:, 1])(at_dbm)
    want_deg = scipy.interpolate.PchipInterpolator(POINTS[:, 0], POINTS[:, 2])(at_dbm)
    np.testing.assert_allclose(dbm(output), want_dbm, atol=1e-10)
    np.testing.assert_allclose(np.rad2deg(np.angle(output)), want_deg, atol=1e-10)


def test_below_the_first_point_gain_and_phase_are_held_and_it_is_told(bench):
    gain = read_amplifier(TABLE).gain(10 ** (np.array([-400.0, -90.0, -40.0]) / 20))
    np.testing.assert_allclose(gain, 10**1.5 * np.exp(1j * np.deg2rad(12.0)), rtol=1e-12)
    site = bench.site(4)
    source = bench.given([1.0, 1e-4, 0.0, 1.0j])
    MeasuredAmplifier(path=str(TABLE), input_power_dbm=-6.0).build(site, source)
    assert "50.000% of the samples lie below the smallest input measured" in site.notes[0].text


def test_above_the_last_point_nothing_is_extrapolated(bench):
    source = bench.given([1.0, 1.0j, 2.0, 0.0])  # mean 1.5, peak 4.26 dB over it
    settings = MeasuredAmplifier(path=str(TABLE), input_power_dbm=7.8)
    with pytest.raises(RecipeError) as caught:
        settings.build(bench.site(4), source)
    assert "0.06 dB beyond the largest input" in caught.value.problem
    MeasuredAmplifier(path=str(TABLE), input_power_dbm=7.7).build(bench.site(4), source)


def test_the_level_is_the_one_asked_for(bench):
    site = bench.site(2)
    settings = MeasuredAmplifier(path=str(TABLE), input_power_dbm=0.0)
    signal = settings.build(site, bench.given([3.0, 3.0j]))
    assert dbm(signal.drive * 3) == pytest.approx(0.0, abs=1e-6)
    # A carrier at 0 dBm leaves at 27.9 dBm: the gain that is undone.
    assert "27.9000 dB, is undone" in site.notes[0].text
    assert np.mean(np.abs(samples_of(signal)) ** 2) == pytest.approx(9.0, rel=1e-6)


def test_back_off_from_the_points_of_the_table(bench):
    source = bench.given([1.0, 1.0j])
    amplifier = read_amplifier(TABLE)
    assert dbm(amplifier.saturation) == pytest.approx(12.0)
    assert dbm(amplifier.compression * amplifier.gain(np.array([amplifier.compression]))[0]) == (
        pytest.approx(dbm(amplifier.compression) + 29.0, abs=0.01)  # highest gain: 30 dB
    )
    for point, amplitude in (
        ("saturation", amplifier.saturation),
        ("compression", amplifier.compression),
    ):
        settings = MeasuredAmplifier(path=str(TABLE), input_back_off_db=6.0, back_off_from=point)
        signal = settings.build(bench.site(2), source)
        assert signal.drive == pytest.approx(amplitude * 10**-0.3, rel=1e-6)


def test_a_table_that_does_not_reach_compression(bench, tmp_path):
    path = tmp_path / "short.csv"
    path.write_text("-40,-10,0\n-30,0,0\n-20,9.9,0\n", encoding="utf-8")
    settings = MeasuredAmplifier(path=path.name, input_back_off_db=6.0)
    site = bench.site(2)
    object.__setattr__(site, "folder", tmp_path)
    with pytest.raises(RecipeError) as caught:
        settings.build(site, bench.given([1.0, 1.0j]))
    assert caught.value.where.endswith("back_off_from")


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("-10,0,0\n-10,1,0\n0,2,0\n", "row 2 does not rise"),
        ("-10,0,0\n0,400,0\n10,2,0\n", "300 dBm"),
        ("-10,0,0\n0,10,0\n", "2 rows"),
        ("input_dbm,output_w,phase_deg\n-10,0,0\n0,1,0\n1,2,0\n", "no column output"),
    ],
)
def test_other_tables_are_refused(tmp_path, text, words):
    path = tmp_path / "table.csv"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(FileError) as caught:
        read_amplifier(path)
    assert words in caught.value.problem


def test_phases_that_wrap_are_followed(tmp_path):
    path = tmp_path / "table.csv"
    path.write_text("-10,0,170\n0,10,-175\n10,20,-170\n", encoding="utf-8")
    gain = read_amplifier(path).gain(10 ** (np.array([-5.0]) / 20))
    assert abs(np.rad2deg(np.angle(gain[0]))) > 170


def test_one_way_to_set_the_level():
    for given in ({}, {"input_power_dbm": 0.0, "input_back_off_db": 3.0}):
        with pytest.raises(QuantityError):
            MeasuredAmplifier(path="a.csv", **given)


def test_laws(bench):
    settings = MeasuredAmplifier(path=str(TABLE), input_power_dbm=0.0)
    site = bench.site(2)
    assert isinstance(settings.law(site, GaussianLaw()), NoLaw)  # has no highest level
    assert isinstance(settings.term(site, GaussianTerm(name="noise")), NoLaw)
    assert settings.law(site, ConstantLaw()).peak_db == pytest.approx(0.0, abs=1e-9)
