from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.files.datatypes import CI16_LE, RI16_LE
from wavegen.production.conversion_level import gain_to_peak, power_of, refuse_cut


def held(lab, samples):
    carrier = lab.held(lab.CARRIER)
    return type(carrier)(
        sample_rate_hz=carrier.sample_rate_hz,
        n_samples=samples.size,
        samples=samples.astype(np.complex64),
    )


def test_the_larger_peak_of_two_channels_counts(lab):
    n = np.arange(1000)
    signals = [held(lab, level * np.exp(2j * np.pi * n / 10)) for level in (0.5, 0.25)]
    powers = [power_of(signal) for signal in signals]
    gain = gain_to_peak(signals, powers, -20.0, loops=True)
    assert gain == pytest.approx(0.1 / 0.5, rel=1e-5)
    assert gain_to_peak(signals[1:], powers[1:], 0.0, loops=True) == pytest.approx(4, rel=1e-5)


@pytest.mark.parametrize("value", [0, np.nan])
def test_what_has_no_power(lab, value):
    with pytest.raises(SignalError):
        power_of(held(lab, np.full(100, value)))


def test_codes_beyond_full_scale(lab):
    signals = [held(lab, np.full(10, value)) for value in (0.5, 0.25 - 1j)]
    for datatype, words in ((CI16_LE, "rail"), (RI16_LE, "sample")):
        file = SimpleNamespace(n_saturated=10, datatype=datatype)
        refuse_cut(file, signals, 1.0)
        with pytest.raises(ArgumentsError, match=r"6\.02 dB over full scale") as caught:
            refuse_cut(file, signals, 2.0)
        assert words in caught.value.problem
