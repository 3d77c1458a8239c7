from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.tones import Notch, Tone, Tones
from wavegen.sources.tones_phases import law_phases, note_uneven

RATE_HZ = Fraction(1_000_000)


def site(n_samples=100_000):
    return Site(sample_rate_hz=RATE_HZ, n_samples=n_samples, seed=1, label="x", path="signal")


def papr_db(settings, here):
    power = np.abs(samples_of(settings.build(here)).astype(complex)) ** 2
    return 10 * np.log10(power.max() / power.mean())


def test_the_peak_told_is_the_peak():
    tones = tuple(
        Tone(frequency_offset_hz=Fraction(1000 * k), level_db=-0.1 * k)
        for k in (0, 3, 4, 9, 15, 22)
    )
    here = site()
    got = papr_db(Tones(tones=tones, phases="optimised"), here)
    (note,) = [note for note in here.notes if note.where == "signal.phases"]
    assert f"{got:.2f} dB peak over mean" in note.text
    assert got < papr_db(Tones(tones=tones, phases="newman"), site()) - 1


def test_a_notch_is_made_before_the_search():
    comb = {"count": 40, "spacing_hz": Fraction(1_000), "phases": "optimised"}
    notched = Tones(**comb, notch=Notch(width_hz=Fraction(6_000)))
    assert papr_db(notched, site()) < 1.6
    assert papr_db(Tones(**comb), site()) < 1.1


def test_a_tone_keeps_the_phase_it_was_given():
    tones = tuple(
        Tone(frequency_offset_hz=Fraction(1000 * k), phase_deg=90.0 if k == 4 else None)
        for k in range(10)
    )
    here = site(1000)
    lines = np.fft.fft(samples_of(Tones(tones=tones, phases="optimised").build(here)))
    assert np.angle(lines[4], deg=True) == pytest.approx(90, abs=1e-3)


def test_tones_that_repeat_too_late_are_refused():
    tones = tuple(Tone(frequency_offset_hz=Fraction(k)) for k in (0, 1, 300_000))
    with pytest.raises(RecipeError) as caught:
        Tones(tones=tones, phases="optimised").build(site(1_000_000))
    assert caught.value.where == "signal.phases"
    assert "300000 lines" in caught.value.problem


@pytest.mark.parametrize("phases", ["newman", "schroeder", "rudin_shapiro"])
def test_laws_for_even_spacing_warn_of_any_other(phases):
    notes = []
    note_uneven(phases, site(), np.array([0, 1, 3]), notes)
    assert "phases: optimised" in notes[0].text
    notes.clear()
    note_uneven(phases, site(), np.array([0, 2, 4]), notes)
    note_uneven("optimised", site(), np.array([0, 1, 3]), notes)
    assert notes == []


def test_rudin_shapiro_warns_of_other_counts():
    notes = []
    law_phases("rudin_shapiro", site(), np.ones(20), notes)
    assert "20 is not a power of two" in notes[0].text
