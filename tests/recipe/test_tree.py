"""Places, and how messages name them."""

import pytest

from wavegen.recipe.tree import Entry, Fault, Place, Scalar, Table, describe


@pytest.mark.parametrize(
    ("place", "path", "text"),
    [
        (Place(3, 7), "signal.kind", "a.yaml:3:7: signal.kind"),
        (Place(3, 7), "", "a.yaml:3:7"),
        (Place(1, 1, "seed"), "seed", "--set seed"),
        (Place(1, 1, "output"), "output.peak", "--set output: output.peak"),
        (Place(1, 1, "output"), "", "--set output"),
    ],
)
def test_a_place_in_words(place: Place, path: str, text: str) -> None:
    assert describe(place, path, "a.yaml") == text


def test_a_fault_becomes_an_error_with_its_fields() -> None:
    error = Fault(Place(2, 3), "seed", "p", "a", "r").error("x.yaml")
    assert (error.where, error.problem) == ("x.yaml:2:3: seed", "p")
    assert (error.allowed, error.remedy) == ("a", "r")


def test_a_table_is_asked_by_key() -> None:
    node = Scalar("1", True, Place(1, 4))
    table = Table((Entry("a", Place(1, 1), node),), Place(1, 1))
    assert table.get("a") is node
    assert table.get("b") is None
