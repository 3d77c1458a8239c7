import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.tones import Notch, Tone, Tones

RATE = Fraction(1_000_000)


def site(n: int, seed: int = 1) -> Site:
    return Site(sample_rate_hz=RATE, n_samples=n, seed=seed, label="a", path="signal")


def at(frequency, level_db=0.0, phase_deg=None):
    return Tone(frequency_offset_hz=Fraction(frequency), level_db=level_db, phase_deg=phase_deg)


def lines_of(samples):
    """Return frequency number and amplitude of what stands above -120 dB."""
    spectrum = np.fft.fft(samples.astype(np.complex128)) / samples.size
    number = np.fft.fftfreq(samples.size, 1 / samples.size).round().astype(int)
    found = np.flatnonzero(np.abs(spectrum) > 1e-6)
    order = np.argsort(number[found])
    return number[found][order], spectrum[found][order]


@pytest.mark.parametrize(
    ("settings", "cycle", "places"),
    [
        ({"count": 3}, 100, [-1, 0, 1]),
        ({"count": 4}, 200, [-3, -1, 1, 3]),
        ({"count": 4, "empty_centre": True}, 100, [-2, -1, 1, 2]),
        ({"count": 1}, 1, [0]),
    ],
)
def test_comb_stands_where_it_is_said_to_and_states_its_loop(settings, cycle, places):
    comb = Tones(spacing_hz=Fraction(10_000), **settings)
    assert comb.cycle(RATE, "signal").n_samples == cycle
    here = site(cycle)
    number, amplitude = lines_of(samples_of(comb.build(here)))
    assert number.tolist() == places
    np.testing.assert_allclose(np.abs(amplitude), 1 / math.sqrt(len(places)), rtol=1e-6)
    assert not here.notes


def test_comb_spacing_is_exact():
    comb = Tones(count=2, spacing_hz=Fraction(812500, 3))
    n = comb.cycle(RATE, "signal").n_samples
    assert n == 96  # 812500/3/2 Hz over 1 MHz = 13/96
    assert lines_of(samples_of(comb.build(site(n))))[0].tolist() == [-13, 13]
    with pytest.raises(RecipeError) as caught:
        comb.build(site(100))
    assert caught.value.where == "signal.spacing"


def test_list_is_scaled_to_unit_power_with_levels_and_phases_kept():
    tones = Tones(tones=(at(30_000, -6.0, 90.0), at(-20_000, 0.0, 0.0)))
    assert tones.cycle(RATE, "signal").n_samples == 1
    number, amplitude = lines_of(samples_of(tones.build(site(1000))))
    assert number.tolist() == [-20, 30]
    assert 20 * np.log10(np.abs(amplitude[1] / amplitude[0])) == pytest.approx(-6.0, abs=1e-4)
    assert np.rad2deg(np.angle(amplitude)).tolist() == pytest.approx([0.0, 90.0], abs=1e-4)
    assert np.sum(np.abs(amplitude) ** 2) == pytest.approx(1.0, abs=1e-6)


def test_list_snaps_to_the_loop_and_says_so():
    here = site(1000)
    signal = Tones(tones=(at(30_100), at(-20_000))).build(here)
    assert lines_of(samples_of(signal))[0].tolist() == [-20, 30]
    note = here.notes[0]
    assert (note.kind, note.asked, note.given) == ("rounded", "30.1 kHz", "30 kHz")
    assert note.where == "signal.tones[0].frequency_offset"
    assert len(here.notes) == 1


def test_law_asks_for_the_same_lines_and_leaves_the_notes_alone():
    here = site(1000)
    tones = Tones(tones=(at(30_100), at(-20_000)))
    assert tones.law(here).peak_db == pytest.approx(10 * math.log10(2), abs=1e-9)
    assert not here.notes


@pytest.mark.parametrize(
    ("settings", "key"),
    [
        ({"tones": (at(1000), at(1100))}, "signal.tones"),
        ({"tones": (at(499_900), at(-499_900))}, "signal.tones"),
        ({"tones": (at(1000), at(500_000))}, "signal.tones[1].frequency_offset"),
        ({"count": 11, "spacing_hz": Fraction(100_000)}, "signal.spacing"),
        ({"count": 3, "spacing_hz": Fraction(1000), "empty_centre": True}, "signal.empty_centre"),
        ({}, "signal"),
        ({"count": 3}, "signal"),
        ({"spacing_hz": Fraction(1000)}, "signal"),
        ({"count": 3, "spacing_hz": Fraction(1000), "tones": (at(0),)}, "signal"),
        (
            {"count": 3, "spacing_hz": Fraction(1000), "notch": Notch(width_hz=Fraction(9999))},
            "signal.notch",
        ),
    ],
)
def test_what_cannot_be_honoured_is_refused_with_its_place(settings, key):
    with pytest.raises(RecipeError) as caught:
        Tones(**settings).build(site(1000))
    assert caught.value.where == key
    assert caught.value.allowed
    assert caught.value.remedy


def test_notch_leaves_tones_out_and_counts_them():
    here = site(1000)
    notch = Notch(width_hz=Fraction(4_000), centre_hz=Fraction(10_000))
    comb = Tones(count=41, spacing_hz=Fraction(1000), notch=notch, phases="newman")
    number, amplitude = lines_of(samples_of(comb.build(here)))
    assert sorted(set(range(-20, 21)) - set(number.tolist())) == [8, 9, 10, 11, 12]
    assert np.sum(np.abs(amplitude) ** 2) == pytest.approx(1.0, abs=1e-5)
    assert here.notes[0].kind == "info"
    assert "5 of 41" in here.notes[0].text
    # The other tones keep the phases of the full comb.
    full = lines_of(
        samples_of(Tones(count=41, spacing_hz=Fraction(1000), phases="newman").build(here))
    )
    kept = np.isin(full[0], number)
    np.testing.assert_allclose(np.angle(amplitude / full[1][kept]), 0, atol=1e-5)


def test_notch_that_meets_no_tone_is_a_warning():
    here = site(1000)
    notch = Notch(width_hz=Fraction(100), centre_hz=Fraction(1_500))
    Tones(count=3, spacing_hz=Fraction(1000), notch=notch).build(here)
    assert [note.kind for note in here.notes] == ["warning"]


def test_doubtful_phases_are_noted():
    here = site(1000)
    Tones(count=20, spacing_hz=Fraction(2000), phases="rudin_shapiro").build(here)
    assert [note.kind for note in here.notes] == ["warning"]
    Tones(tones=(at(0), at(1000), at(5000)), phases="newman").build(here)
    assert [note.where for note in here.notes] == ["signal.phases"] * 2
    Tones(tones=(at(0), at(1000), at(2000)), phases="schroeder").build(here)
    Tones(count=16, spacing_hz=Fraction(2000), phases="rudin_shapiro").build(here)
    assert len(here.notes) == 2


def test_random_phases_follow_the_seed():
    comb = Tones(count=9, spacing_hz=Fraction(1000))
    first, again, other = (samples_of(comb.build(site(1000, seed))) for seed in (1, 1, 2))
    np.testing.assert_array_equal(first, again)
    assert not np.array_equal(first, other)


def test_intricate_lists_have_no_law():
    assert Tones(tones=(at(0), at(1), at(400_000))).law(site(1_000_000)) is None
    assert Tones(tones=(at(0), at(400_000))).law(site(1_000_000)) is not None
    assert Tones(tones=(at(400_000),)).law(site(1_000_000)).peak_db == 0.0
