import re

import pytest

from wavegen.cli.listing import TOPICS
from wavegen.files import FORMATS
from wavegen.recipe.find import shipped_recipes
from wavegen.sources import SOURCES
from wavegen.stages import COMBINERS, STAGES


def test_everything_with_one_line_each(call):
    said = call("list")
    assert said.status == 0
    assert said.err == ""
    for topic in TOPICS:
        assert topic.capitalize() in said.out
    for name in (*SOURCES, *COMBINERS, *STAGES, *FORMATS):
        assert name in said.out
    assert max(map(len, said.out.splitlines())) <= 80


@pytest.mark.parametrize("topic", TOPICS)
def test_one_topic(call, topic):
    document = call("list", topic, "--json").json()
    assert list(document) == [topic]
    assert document[topic]
    for row in document[topic]:
        assert row["name"]
        assert len(row["about"]) > 5
        assert not re.search(r"``|:\w+:|Settings of", row["about"])


def test_recipes_have_their_titles(call):
    rows = call("list", "recipes", "--json").json()["recipes"]
    assert [(row["name"], row["about"]) for row in rows] == [
        (name, title) for name, title, _ in shipped_recipes()
    ]
