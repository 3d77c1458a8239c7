import dataclasses

import pytest

from wavegen.core.table import Table


def test_holds_rows_of_text_and_compares_by_value():
    table = Table(title="Levels", headings=("level, dB",), rows=(("1.0",),))
    assert table == dataclasses.replace(table)
    assert table.right == frozenset()


def test_cannot_be_changed():
    table = Table(title="Levels", headings=("a",), rows=())
    with pytest.raises(dataclasses.FrozenInstanceError):
        table.title = "Other"
