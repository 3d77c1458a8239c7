import pickle

import pytest

from wavegen.core import errors

FIELDS = {"where": "a.b", "problem": "4 dB", "allowed": "up to 3 dB", "remedy": "Lower it."}
PLAIN = [
    errors.WavegenError,
    errors.ArgumentsError,
    errors.RecipeError,
    errors.SignalError,
    errors.FileError,
    errors.TargetMissed,
]


@pytest.mark.parametrize("kind", PLAIN)
def test_says_where_what_allowed_and_remedy(kind):
    error = kind(**FIELDS)
    assert {name: getattr(error, name) for name in FIELDS} == FIELDS
    assert str(error) == "a.b: 4 dB; allowed: up to 3 dB. Lower it."
    assert isinstance(error, errors.WavegenError)


@pytest.mark.parametrize("kind", PLAIN)
def test_crosses_a_process_border_with_its_fields(kind):
    error = pickle.loads(pickle.dumps(kind(**FIELDS)))  # noqa: S301 - our own bytes
    assert type(error) is kind
    assert {name: getattr(error, name) for name in FIELDS} == FIELDS


@pytest.mark.parametrize("missing", FIELDS)
def test_no_field_may_be_left_out(missing):
    with pytest.raises(TypeError):
        errors.RecipeError(**{name: text for name, text in FIELDS.items() if name != missing})


class TestFaults:
    def faults(self):
        first = errors.RecipeError(**FIELDS)
        second = errors.RecipeError(**(FIELDS | {"where": "c"}))
        return errors.RecipeFaults([first, second])

    def test_speaks_for_the_first_and_lists_all(self):
        faults = self.faults()
        assert (faults.where, faults.problem) == ("a.b", "4 dB")
        assert [line.partition(":")[0] for line in str(faults).splitlines()] == ["a.b", "c"]
        assert isinstance(faults, errors.RecipeError)

    def test_crosses_a_process_border_with_its_list(self):
        faults = pickle.loads(pickle.dumps(self.faults()))  # noqa: S301 - our own bytes
        assert type(faults) is errors.RecipeFaults
        assert [fault.where for fault in faults.faults] == ["a.b", "c"]
