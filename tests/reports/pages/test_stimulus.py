"""Pages of stimuli and measurements."""

from wavegen.reports.figures.stimulus import pictures_of
from wavegen.reports.pages.page import html_of
from wavegen.reports.pages.stimulus import measurement_page, stimulus_page


def test_the_page_of_a_stimulus(made_document, gated_views):
    pictures = pictures_of(made_document, gated_views, title="T")
    html = html_of(stimulus_page(made_document, pictures))
    assert "<h1>A &lt;gated&gt; carrier</h1>" in html
    assert "The power exceeds its mean by" in html
    assert "Before you connect anything" in html
    assert "kind: gate, duty: 50 %" in html  # the recipe
    assert made_document["files"][0]["sha512"] in html
    assert "amplifier" in html  # levels along the path
    for picture in pictures:
        assert f'id="picture-{picture.name}"' in html


def test_the_page_of_a_measurement(measured_document, gated_views):
    pictures = pictures_of(measured_document, gated_views, title="T")
    html = html_of(measurement_page(measured_document, pictures))
    assert "<h1>gated</h1>" in html
    assert "Power statistics" in html
