"""A page as HTML: escaped, alone, well-formed."""

import base64
import hashlib
import re
from html.parser import HTMLParser

from wavegen.reports.pages.page import html_of

OWN_TAGS = {
    "a", "body", "caption", "circle", "clippath", "dd", "defs", "div", "dl", "dt", "figcaption",
    "figure", "footer", "g", "h1", "h2", "head", "header", "html", "li", "main", "meta", "output",
    "p", "path", "pre", "rect", "script", "section", "strong", "style", "svg", "table", "tbody",
    "td", "text", "th", "thead", "title", "tr", "tspan", "ul", "use",
}  # fmt: skip


class Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.texts: list[str] = []

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))

    def handle_data(self, data):
        self.texts.append(data)


def read(html):
    reader = Reader()
    reader.feed(html)
    return reader


def test_texts_from_files_stay_text(hostile_page):
    reader = read(html_of(hostile_page))
    assert {tag for tag, _ in reader.tags} <= OWN_TAGS
    assert all(not name.startswith("on") for _, attrs in reader.tags for name in attrs)
    assert sum(tag == "script" for tag, _ in reader.tags) == 4  # three data sets, one script


def test_only_its_own_script_may_run(hostile_page):
    html = html_of(hostile_page)
    (script,) = re.findall(r"<script>(.*?)</script>", html, re.DOTALL)
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    assert f"script-src 'sha256-{digest}'" in html
    assert "default-src 'none'" in html


def test_nothing_is_fetched(hostile_page):
    reader = read(html_of(hostile_page))
    for tag, attrs in reader.tags:
        for name, value in attrs.items():
            if name in {"src", "href", "xlink:href", "data", "action"}:
                assert value.startswith("#"), (tag, name, value)
    assert "url(http" not in html_of(hostile_page)


def test_ids_are_unique_and_references_hold(hostile_page):
    reader = read(html_of(hostile_page))
    ids = [attrs["id"] for _, attrs in reader.tags if "id" in attrs]
    assert len(ids) == len(set(ids))
    wanted = {
        value[1:]
        for _, attrs in reader.tags
        for name, value in attrs.items()
        if name in {"href", "xlink:href"}
    }
    assert wanted <= set(ids)


def test_the_same_page_gives_the_same_bytes(hostile_page):
    assert html_of(hostile_page) == html_of(hostile_page)
