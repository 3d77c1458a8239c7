from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.units import QuantityError
from wavegen.sources.ofdm_layout import CyclicPrefix, Layout, Stretch, fft_length, lay_out

NONE = Stretch.parse("0 samples")


@pytest.mark.parametrize(
    ("value", "samples"),
    [("144/2048", 72), ("16 samples", 16), ("1 sample", 1), ("0.25", 256), (0.25, 256), (0, 0)],
)
def test_lengths_in_samples_of_a_1024_point_symbol(value, samples) -> None:
    found = Stretch.parse(value)
    assert found.samples(1024) == samples
    assert Stretch.parse(str(found)) == found


@pytest.mark.parametrize(
    "value", ["16", 16, "1.5", "-1/4", "2.5 samples", "4 us", "wide", None, True, [1], "1e99"]
)
def test_what_is_no_length_is_refused(value) -> None:
    with pytest.raises(QuantityError):
        Stretch.parse(value)


@pytest.mark.parametrize(
    "value",
    [
        ["160/2048", "6 x 144/2048"],
        "160/2048, 6x144/2048",
        ["160/2048"] + ["144/2048"] * 6,
        ["20 samples", "6 x 18 samples"],
    ],
)
def test_a_slot_of_prefixes(value) -> None:
    prefix = CyclicPrefix.parse(value)
    assert CyclicPrefix.parse(str(prefix)) == prefix
    layout = lay_out(n_fft=256, prefix=prefix, edge=NONE, path="signal")
    assert layout.prefixes == (20, 18, 18, 18, 18, 18, 18)
    assert (layout.n_symbols, layout.n_samples) == (7, 7 * 256 + 128)


@pytest.mark.parametrize("value", [[], "0 x 1/4", "x 1/4", "99999 x 1/4", "two x 1/4", ["1/4", []]])
def test_what_is_no_pattern_is_refused(value) -> None:
    with pytest.raises(QuantityError):
        CyclicPrefix.parse(value)


def test_a_pattern_is_as_short_as_it_repeats() -> None:
    prefix = CyclicPrefix.parse(["2 x 4 samples", "8 samples", "2 x 4 samples", "8 samples"])
    assert lay_out(n_fft=16, prefix=prefix, edge=NONE, path="s").prefixes == (4, 4, 8)


def test_a_prefix_that_is_not_whole_names_what_would_fit() -> None:
    prefix = CyclicPrefix.parse("144/2048")
    with pytest.raises(RecipeError) as caught:
        lay_out(n_fft=100, prefix=prefix, edge=NONE, path="signal")
    assert caught.value.where == "signal.cyclic_prefix"
    assert "7 samples or 8 samples" in caught.value.allowed
    assert "multiple of 128" in caught.value.remedy


def test_a_prefix_fits_the_symbol() -> None:
    with pytest.raises(RecipeError) as caught:
        lay_out(n_fft=8, prefix=CyclicPrefix.parse("9 samples"), edge=NONE, path="signal")
    assert caught.value.where == "signal.cyclic_prefix"


@pytest.mark.parametrize("edge", ["5 samples", "1/3"])
def test_an_edge_is_whole_and_fits_the_shortest_prefix(edge) -> None:
    prefix = CyclicPrefix.parse("8 samples, 4 samples")
    with pytest.raises(RecipeError) as caught:
        lay_out(n_fft=64, prefix=prefix, edge=Stretch.parse(edge), path="signal")
    assert caught.value.where == "signal.edge_window"


def test_fft_length() -> None:
    rate, spacing = Fraction(30720000), Fraction(15000)
    assert fft_length(sample_rate_hz=rate, spacing_hz=spacing, where="x") == 2048


def test_a_broken_fft_length_names_the_nearest_rates() -> None:
    with pytest.raises(RecipeError) as caught:
        fft_length(sample_rate_hz=Fraction(20000000), spacing_hz=Fraction(15000), where="x.y")
    assert caught.value.where == "x.y"
    assert "19.995 MHz or 20.01 MHz" in caught.value.remedy


@pytest.mark.parametrize("rate", [1, 15000 << 21])
def test_fft_lengths_have_bounds(rate) -> None:
    with pytest.raises(RecipeError):
        fft_length(sample_rate_hz=Fraction(rate), spacing_hz=Fraction(15000), where="x")


def test_the_edges_add_up_to_one() -> None:
    rising = Layout(n_fft=64, prefixes=(16,), edge=9).rising
    assert np.allclose(rising + rising[::-1], 1)
    assert np.all(np.diff(rising) > 0)
