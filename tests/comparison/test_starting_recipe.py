import pytest

from wavegen.comparison.familiar import FAMILIES
from wavegen.comparison.look_alike import LookAlike
from wavegen.comparison.starting_recipe import starting_recipe
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
