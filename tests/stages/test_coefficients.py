import json
from fractions import Fraction

import pytest

from wavegen.core.errors import FileError
from wavegen.stages.coefficients import ALIGNED, CROSSED, MOST_TERMS, Term, read_coefficients

TERMS = [
    {"order": 1, "delay": 0, "lag": 0, "re": 1.0, "im": 0.5},
    {"order": 3, "delay": 2, "lag": -1, "re": -0.25, "im": 0.0},
]


def read(tmp_path, content, name="c.json", columns=CROSSED):
    path = tmp_path / name
    path.write_text(content if isinstance(content, str) else json.dumps(content), encoding="utf-8")
    return read_coefficients(path, columns)


def test_csv_and_json_tell_the_same(tmp_path):
    one = read(tmp_path, {"coefficients": TERMS, "sample_rate": "1 MHz", "largest_amplitude": 2})
    rows = "".join(",".join(str(value) for value in term.values()) + "\n" for term in TERMS)
    two = read(
        tmp_path,
        "# sample_rate: 1 MHz\n# largest_amplitude: 2\norder,delay,lag,re,im\n" + rows,
        "c.csv",
    )
    assert one.terms == two.terms == (Term(1, 0, 0, 1 + 0.5j), Term(3, 2, -1, -0.25 + 0j))
    assert one.sample_rate_hz == two.sample_rate_hz == Fraction(10**6)
    assert one.largest_amplitude == two.largest_amplitude == 2.0


def test_what_is_not_said(tmp_path):
    found = read(tmp_path, "1,0,1,0\n3,1,0.1,0\n", "c.csv", ALIGNED)
    assert found.terms[1] == Term(3, 1, 0, 0.1 + 0j)
    assert found.sample_rate_hz is None
    assert found.largest_amplitude == 1.0


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"order": 0}, "order of term 2"),
        ({"order": 16}, "order of term 2"),
        ({"order": 2.5}, "order of term 2"),
        ({"delay": -1}, "delay of term 2"),
        ({"delay": 65}, "delay of term 2"),
        ({"lag": 65}, "lag of term 2"),
        ({"re": 1e10}, "coefficient of term 2"),
        ({"re": True}, "no number"),
        ({"re": "1"}, "no number"),
        ({"x": 1}, "other keys"),
        ({"order": 1, "delay": 0, "lag": 0}, "twice"),
    ],
)
def test_terms_beyond_the_limits_are_refused(tmp_path, change, words):
    with pytest.raises(FileError) as caught:
        read(tmp_path, {"coefficients": [TERMS[0], TERMS[1] | change]})
    assert words in caught.value.problem


@pytest.mark.parametrize(
    ("document", "words"),
    [
        ({"coefficients": TERMS, "sample_rat": "1 MHz"}, "unknown key"),
        ({"coefficients": TERMS, "sample_rate": "1"}, "sample_rate"),
        ({"coefficients": TERMS, "largest_amplitude": 0}, "largest_amplitude"),
        ({"coefficients": TERMS, "largest_amplitude": True}, "largest_amplitude"),
        ({"coefficients": TERMS, "largest_amplitude": "wide"}, "largest_amplitude"),
        ({"coefficients": []}, "no list"),
        ({"coefficients": {"a": 1}}, "no list"),
        ({}, "no list"),
        ({"coefficients": [1]}, "other keys"),
        ({"coefficients": [TERMS[0] | {"re": 0, "im": 0}]}, "not zero"),
        ([], ""),
        ("{", ""),
    ],
)
def test_documents_of_another_form_are_refused(tmp_path, document, words):
    with pytest.raises(FileError) as caught:
        read(tmp_path, document)
    assert words in caught.value.problem


def test_too_many_terms(tmp_path):
    rows = "".join(f"{1 + n % 15},{n // 15 % 65},{n // 975},1,0\n" for n in range(MOST_TERMS + 1))
    with pytest.raises(FileError) as caught:
        read(tmp_path, rows, "c.csv")
    assert f"{MOST_TERMS + 1} terms" in caught.value.problem
