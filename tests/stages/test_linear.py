import pytest

from wavegen.stages.linear import tell_power


@pytest.mark.parametrize(
    ("gain", "is_undone", "kind", "words"),
    [
        (0.5, False, "info", "-3.010 dB; found on the whole loop"),
        (0.5, True, "info", "which is undone"),
        (1e-11, False, "warning", "next to nothing"),
        (None, False, "warning", "next to nothing"),
    ],
)
def test_what_is_told(bench, gain, is_undone, kind, words):
    site = bench.site(100)
    tell_power(site, bench.gaussian(100), gain, is_undone=is_undone)
    (note,) = site.notes
    assert note.kind == kind
    assert words in note.text
    tell_power(site, bench.gaussian(1 << 20), gain)
    assert "64 stretches" in site.notes[-1].text
