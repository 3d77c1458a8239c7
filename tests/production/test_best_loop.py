import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.core.render import samples_of
from wavegen.production.best_loop import best_loop, reseeded
from wavegen.production.judgement import law_of
from wavegen.production.prepare import prepare

PROBABILITIES = [0.1, 0.01, 10**-1.5]


def by_numpy(loaded, law):
    """Return the largest deviation of a level, from the samples themselves."""
    power = np.sort(np.abs(samples_of(prepare(loaded).built.signal).astype(np.complex128)) ** 2)
    mean = power.mean()
    found = [power[power.size - 1 - int(q * power.size * (1 + 1e-12))] for q in PROBABILITIES]
    return max(np.abs(10 * np.log10(np.array(found) / mean) - law.level_db(PROBABILITIES)))


def test_it_is_the_nearest_of_all_by_numpy(lab):
    loaded = lab.load(lab.SINGLE, overrides=["seed=5"])
    law = law_of(prepare(loaded))
    found = best_loop(loaded, n_tries=6, down_to=0.01)
    each = [by_numpy(reseeded(loaded, seed), law) for seed in range(5, 11)]
    best = int(np.argmin(each))
    assert found.loaded.recipe.seed == found.rows["chosen_seed"] == 5 + best
    # A bin of the histogram is 0.0085 dB.
    assert found.rows["deviation_db"] == pytest.approx(each[best], abs=0.009)
    assert found.rows["first_deviation_db"] == pytest.approx(each[0], abs=0.009)
    assert found.rows["median_deviation_db"] == pytest.approx(np.median(each), abs=0.009)
    assert found.rows["deviation_db"] < found.rows["median_deviation_db"]


def test_the_choice_is_made_again_the_same(lab):
    loaded = lab.load(lab.SINGLE)
    first, again = (best_loop(loaded, n_tries=4, down_to=0.01, workers=n) for n in (1, 2))
    assert first.rows == again.rows
    assert first.loaded.overrides == again.loaded.overrides


def test_an_override_says_which(lab):
    loaded = lab.load(lab.SINGLE, overrides=["duration=1 ms"])
    other = reseeded(loaded, 12)
    assert other.recipe.seed == 12
    assert other.overrides == ("duration=1 ms", "seed=12")
    assert other.text == loaded.text
    assert reseeded(loaded, loaded.recipe.seed) is loaded


@pytest.mark.parametrize("source", ["TONES", "CARRIER"])
def test_what_is_the_same_for_every_seed_is_refused(lab, source):
    with pytest.raises(ArgumentsError) as caught:
        best_loop(lab.load(getattr(lab, source)), n_tries=3, down_to=0.01)
    assert caught.value.where == "--best-of"
    assert "every seed" in caught.value.problem


def test_what_has_no_law_is_refused_by_its_reason(lab):
    text = lab.SINGLE + "stages: [{kind: filter, bandwidth: 1 MHz}]\n"
    with pytest.raises(ArgumentsError, match="filter"):
        best_loop(lab.load(text), n_tries=3, down_to=0.01)


def test_a_loop_too_short_for_the_probability_is_refused(lab):
    with pytest.raises(ArgumentsError) as caught:
        best_loop(lab.load(lab.SINGLE), n_tries=2, down_to=1e-4)  # 8000 samples
    assert caught.value.where == "--down-to"


def test_of_bursts_the_on_time_is_compared(lab):
    gate = "stages: [{kind: gate, duty: 50 %, period: 1 ms}]\n"
    loaded = lab.load(lab.NOISE + gate, overrides=["duration=20 ms"])
    found = best_loop(loaded, n_tries=2, down_to=0.01)
    # 40 000 samples of the on-time, a quarter of them independent: 1 % is good to 0.1 dB.
    assert found.rows["first_deviation_db"] < 0.3


def test_make_writes_it_down(lab, tmp_path):
    made = lab.make(lab.SINGLE, tmp_path, best_of=3, question=lab_question())
    rows = made.document["best_of"]
    assert rows["n_tried"] == 3
    assert made.document["seed"] == rows["chosen_seed"]
    assert made.document["recipe"]["overrides"] in ([], [f"seed={rows['chosen_seed']}"])
    plain = lab.make(lab.SINGLE, tmp_path / "plain", overrides=[f"seed={rows['chosen_seed']}"])
    assert plain.document["best_of"] is None
    assert plain.document["files"][0]["sha512"] == made.document["files"][0]["sha512"]


def lab_question():
    from wavegen.production.judgement import Question

    return Question(down_to=0.01)
