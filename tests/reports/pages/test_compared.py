"""Pages of comparisons."""

from wavegen.reports.figures.compared import shape_pictures
from wavegen.reports.pages.compared import match_page, shape_page
from wavegen.reports.pages.page import html_of


def test_the_page_of_a_shaped_stimulus():
    rows = [
        {"probability": q, "stimulus_db": x, "field_db": x, "difference_db": 0.0}
        for q, x in ((0.5, -1.6), (0.01, 6.6))
    ]
    document = {
        "verdict": "match",
        "name": "twin",
        "field": "<field>",
        "largest_difference_db": 0.0,
        "tolerance_db": 0.05,
        "down_to": 0.01,
        "levels": rows,
        "levels_are": "of all of the time",
        "recipe": "twin.yaml",
        "files": [{"name": "twin.sigmf-data", "format": "sigmf", "datatype": "ci16_le"}],
        "skipped_samples": 0,
        "spectrum": None,
        "gate": None,
        "warnings": [{"where": "here", "text": "something"}],
    }
    html = html_of(shape_page(document, shape_pictures(document)))
    assert "twin, in the shape of &lt;field&gt;" in html
    assert 'class="verdict good"' in html
    assert "here: something" in html
    assert "Before you connect anything" in html


RECIPE = "wavegen: 1\nsignal:\n  kind: noise\n"


def match_document(**more):
    side = {"is": "a loop", "duty": None, "mean_dbm": None, "mean_dbfs": -3.0}
    look = {
        "is_near": True,
        "recipe": RECIPE,
        "law": "complex Gaussian",
        "duty": 1,
        "largest_deviation_db": 0.01,
        "at_probability": 0.01,
    }
    return {
        "verdict": "undecided",
        "statement": "undecided: too little",
        "stimulus": side | {"name": "a"},
        "field": side | {"name": "b"},
        "levels": [],
        "looks_like": [look],
        "spectrum": None,
        "mean_difference": None,
        "largest_difference_db": None,
        "warnings": [],
    } | more


def test_the_recipe_to_start_from_is_shown_as_it_is():
    page = match_page(match_document(), [])
    assert page.summary[0].startswith("Undecided")
    assert not any("wavegen: 1" in sentence for sentence in page.summary)
    assert [section.text for section in page.sections if section.text] == [RECIPE]
    html = html_of(page)
    assert "wavegen: 1\nsignal:\n  kind: noise" in html


def test_without_a_near_law_there_is_no_recipe():
    page = match_page(match_document(looks_like=[]), [])
    assert not any(section.text for section in page.sections)
