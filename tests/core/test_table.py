from dataclasses import FrozenInstanceError

import pytest

from wavegen.core.table import Table


def test_a_table_is_plain_data_that_stays():
    table = Table(title="Levels", headings=("a", "b"), rows=(("1", "2"),))
    assert table.right == frozenset()
    assert table == Table(title="Levels", headings=("a", "b"), rows=(("1", "2"),))
    with pytest.raises(FrozenInstanceError):
        table.title = "other"
