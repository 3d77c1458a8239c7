"""Pages of comparisons."""

from wavegen.reports.figures.compared import shape_pictures
from wavegen.reports.pages.compared import shape_page
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
