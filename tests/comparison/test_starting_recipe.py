import pytest

from wavegen.comparison.difference import probabilities
from wavegen.comparison.familiar import FAMILIES
from wavegen.comparison.look_alike import LookAlike
from wavegen.comparison.starting_recipe import starting_recipe
from wavegen.laws.term import NoLaw
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text


@pytest.mark.parametrize("family", FAMILIES, ids=lambda item: item.name)
@pytest.mark.parametrize("duty", [1.0, 0.277])
@pytest.mark.parametrize("width_hz", [None, 1.2345e4, 1.9e7])
def test_each_can_be_made(family, duty, width_hz):
    found = LookAlike(
        family=family,
        value=family.values[len(family.values) // 2],
        duty=duty,
        largest_deviation_db=0.1,
        at_probability=0.01,
        excess_db=0.0,
    )
    text = starting_recipe(found, width_hz=width_hz)
    assert max(map(len, text.splitlines())) <= 80
    prepared = prepare(load_text(text, name="start"))
    length = prepared.site.n_samples / float(prepared.site.sample_rate_hz)
    assert length * (width_hz or 1e6) == pytest.approx(2e4, rel=0.5)


@pytest.mark.parametrize(
    ("number", "value"),
    [(0, 0.0), (1, 6.5), (2, 7.0), (3, 0.35), (4, 0.22), (5, 0.2), (6, 0.12), (7, 1.0)],
)
def test_each_makes_a_signal_of_its_law(number, value):
    """The law of what the recipe makes is the law that it was found by.

    Of equal tones only the single one: the law of more is that of one draw of phases.
    """
    family = FAMILIES[number]
    found = LookAlike(
        family=family,
        value=value,
        duty=1.0,
        largest_deviation_db=0.1,
        at_probability=0.01,
        excess_db=0.0,
    )
    prepared = prepare(load_text(starting_recipe(found, width_hz=5e6), name="start"))
    recipe = prepared.loaded.recipe
    law = law_of_recipe(recipe.signal, recipe.stages, prepared.site)
    assert not isinstance(law, NoLaw), law
    asked = probabilities(1e-4)
    # Eight instants a symbol in the family, others in the recipe: 0.02 dB each.
    assert law.level_db(asked) == pytest.approx(family.levels(value, asked), abs=0.04)
