import numpy as np
import pytest

from wavegen.comparison.assumptions import doubts
from wavegen.comparison.device_gain import device_gain
from wavegen.comparison.spectra import side_spectrum, spectrum_difference

N = 1 << 16


@pytest.fixture
def found(side):
    """The assumptions of an input and an output, by name."""

    def found(first, second, **settings):
        sides = side(first, **settings), side(second, **settings)
        spectra = spectrum_difference(*(side_spectrum(item) for item in sides))
        gain = device_gain(sides, spectra, tolerance_db=0.2, down_to=1e-3)
        return {item.name: item for item in gain.assumptions}

    return found


def test_all_is_well(found, noise, rapp):
    samples = noise(N) * 0.4
    told = found(samples, rapp(samples))
    assert {item.holds for item in told.values()} == {True}
    assert not [*doubts(tuple(told.values()))]


def test_different_captures(found, noise, rapp):
    told = found(noise(N) * 0.4, rapp(noise(N) * 0.4), loops=False)
    assert told["one_signal"].holds is None
    assert "different captures" in told["one_signal"].says
    assert told["no_memory"].holds is None
    loops = found(noise(N) * 0.4, rapp(noise(N) * 0.4))
    assert loops["one_signal"].holds is None
    assert "do not correspond" in loops["one_signal"].says


def test_a_noise_floor_behind_the_device(found, rapp, rng):
    """Of two tones, whose envelope goes through zero; noise itself would only grow."""
    turns = 2 * np.pi * np.arange(N) * 500 / N
    samples = 0.4 * np.sqrt(2) * np.cos(turns) * np.exp(0.1j * turns)
    hiss = 0.03 * (rng.standard_normal(N) + 1j * rng.standard_normal(N))  # 20 dB down
    told = found(samples, rapp(samples) + hiss)["noise_floor"]
    assert told.holds is False
    assert "output" in told.says
    told = found(samples + hiss, rapp(samples))["noise_floor"]
    assert told.holds is False
    assert "input" in told.says


def test_a_limit_and_a_fold_look_alike_until_aligned(found, noise):
    samples = noise(N) * 0.7
    limited = samples / np.maximum(np.abs(samples), 1)
    other = noise(N) * 0.7
    told = found(other, limited, loops=False)["output_rises"]
    assert told.holds is None
    assert "folds back" in told.says
    assert found(samples, limited)["output_rises"].holds is True
    r = np.abs(samples) * 1.5
    folded = samples / np.abs(samples) * 2.1587 * r / (1 + 1.1517 * r**2)
    told = found(samples, folded)["output_rises"]
    assert told.holds is False
    assert [*doubts((told,))] == [told.says]


def test_memory(found, noise, rapp):
    samples = noise(N) * 0.4
    late = np.roll(rapp(samples), 2)
    told = found(samples, rapp(samples) + 0.1 * late * np.abs(late) ** 2)["no_memory"]
    assert told.holds is False
    assert "neighbours" in told.says
