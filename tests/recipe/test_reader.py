"""Guards act on events, before anything large is built."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.recipe import reader
from wavegen.recipe.reader import DEEPEST, MOST_NODES, read_tree
from wavegen.recipe.tree import FaultError, Items, Place, Scalar, Table


def test_text_and_places_survive() -> None:
    root, faults = read_tree('a: 0.10\nb:\n  - "x"\n  - {c: 1e6}\n')
    assert not faults
    assert isinstance(root, Table)
    first = root.get("a")
    assert first == Scalar("0.10", True, Place(1, 4))
    inside = root.get("b")
    assert isinstance(inside, Items)
    assert inside.place == Place(2, 1)  # a block is named by its key
    assert inside.nodes[0] == Scalar("x", False, Place(3, 5))
    assert inside.nodes[1].place == Place(4, 5)


def test_an_alias_is_what_it_names() -> None:
    root, _ = read_tree("a: &x {k: 1}\nb: *x\nc: [*x, *x]\n")
    assert isinstance(root, Table)
    assert root.get("b") is root.get("a")


def test_an_anchor_may_be_given_anew() -> None:
    root, _ = read_tree("a: &x 1\nb: &x 2\nc: *x\n")
    assert isinstance(root, Table)
    assert root.get("c") is root.get("b")


def bomb(levels: int, width: int) -> str:
    lines = ["a0: &a0 [x, x]"]
    lines += [
        f"a{level}: &a{level} [" + ", ".join([f"*a{level - 1}"] * width) + "]"
        for level in range(1, levels)
    ]
    return "\n".join(lines)


@pytest.mark.parametrize("width", [2, 10])
def test_alias_bombs_are_refused_unexpanded(width: int) -> None:
    with pytest.raises(FaultError) as caught:
        read_tree(bomb(30, width))
    assert str(MOST_NODES) in caught.value.fault.problem


def test_a_chain_of_aliases_counts_as_nesting() -> None:
    text = "\n".join(["a0: &a0 [x]"] + [f"a{n}: &a{n} [*a{n - 1}]" for n in range(1, 60)])
    with pytest.raises(FaultError) as caught:
        read_tree(text)
    assert "levels deep" in caught.value.fault.problem


@pytest.mark.parametrize("opening", ["[", "{a: ", "[\n", "- ", "? "])
def test_deep_nesting_is_refused_without_recursion(opening: str) -> None:
    with pytest.raises(FaultError) as caught:
        read_tree(opening * 20000)
    word = "as a key" if opening == "? " else "levels deep"
    assert word in caught.value.fault.problem


def test_depth_is_allowed_up_to_the_limit() -> None:
    read_tree("[" * DEEPEST + "]" * DEEPEST)
    with pytest.raises(FaultError):
        read_tree("[" * (DEEPEST + 1) + "]" * (DEEPEST + 1))


def test_size_is_allowed_up_to_the_limit(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(reader, "MOST_NODES", 100)
    read_tree("[" + "1," * 99 + "]")
    with pytest.raises(FaultError):
        read_tree("[" + "1," * 100 + "]")


@pytest.mark.parametrize(
    ("text", "place", "word"),
    [
        ("", (1, 1), "nothing"),
        ("# only a comment\n", (1, 1), "nothing"),
        ("a: 1\n---\nb: 2\n", (2, 1), "second document"),
        ("%YAML 1.1\n---\na: 1\n", (2, 1), "version"),
        ("a: !!str 1", (1, 4), "tag"),
        ("a: !x {b: 1}", (1, 4), "tag"),
        ("a: !!python/object/apply:os.system [ls]", (1, 4), "tag"),
        ("a: ! 1", (1, 4), "tag"),
        ("<<: {a: 1}", (1, 1), "merge"),
        ("a: *b", (1, 4), "names nothing"),
        ("a: &a [*a]", (1, 8), "inside what it names"),
        ("a: &a {b: *a}", (1, 11), "inside what it names"),
        ("? [a]\n: 1", (1, 3), "key"),
        ("? {a: 1}\n: 1", (1, 3), "key"),
        ("a: [1", (1, 6), "no YAML"),
        ("a: b: c", (1, 5), "no YAML"),
        ("a: 1\n\tb: 2", (2, 1), "no YAML"),
        ("a: \x00", (1, 4), "no YAML"),
        ("a: 1\nb: \x07", (2, 4), "no YAML"),
        ('"\\UFFFFFFFF"', (1, 1), "no YAML"),
        ('a: "\\q"', (1, 6), "no YAML"),
        ("a: 'x", (1, 4), "no YAML"),
    ],
)
def test_refusals_say_where(text: str, place: tuple[int, int], word: str) -> None:
    with pytest.raises(FaultError) as caught:
        read_tree(text)
    fault = caught.value.fault
    assert (fault.place.line, fault.place.column) == place
    assert word in fault.problem
    assert fault.allowed
    assert fault.remedy


def test_duplicate_keys_are_all_told() -> None:
    root, faults = read_tree("a: 1\na: 2\nb: {c: 1, c: 2}\n")
    assert [(f.place.line, f.place.column) for f in faults] == [(2, 1), (3, 11)]
    assert isinstance(root, Table)
    assert root.get("a") == Scalar("1", True, Place(1, 4))


def test_an_open_bracket_is_named_by_its_line() -> None:
    with pytest.raises(FaultError) as caught:
        read_tree("a: 1\nb: [1,\n  2\nc: 3\n")
    assert "line 2" in caught.value.fault.remedy


yaml_like = st.text(alphabet="ab1:-[]{},&*!|>'\"%#?\\ \n\tU0.", max_size=60)


@given(text=yaml_like)
def test_any_text_is_read_or_refused(text: str) -> None:
    try:
        read_tree(text)
    except FaultError:
        return
