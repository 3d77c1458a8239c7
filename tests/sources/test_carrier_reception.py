"""Untouched carriers come back: EVM below 0.01 % with every default pulse."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.dsp.arrival import Arrival
from wavegen.dsp.pulses.gaussian import Gaussian
from wavegen.dsp.pulses.half_sine import HalfSine
from wavegen.dsp.pulses.raised_cosine import RaisedCosine
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.rotation import Rotation
from wavegen.sources.single_carrier import SingleCarrier

RATE_HZ = Fraction(1_000_000)

CASES = {
    "default": (4, {}),
    "sharp": (2, {"pulse": RootRaisedCosine(roll_off=0.05)}),
    "fractional": (Fraction(10, 3), {"constellation": "64qam"}),
    "staggered": (4, {"constellation": "16qam", "stagger": True}),
    "staggered, fractional": (Fraction(10, 3), {"stagger": True}),
    "half sine": (8, {"stagger": True, "pulse": HalfSine()}),
    "rotated": (4, {"constellation": "8psk", "rotation": Rotation.parse("3 pi/8")}),
    "differential": (4, {"rotation": Rotation.parse("pi/4"), "differential": True}),
    "held": (5, {"pulse": Rectangular()}),
    "raised cosine": (4, {"pulse": RaisedCosine(roll_off=0.3)}),
    "Gaussian": (8, {"pulse": Gaussian(bt=0.3)}),
}


def build(per_symbol, constellation="qpsk", **settings):
    settings = SingleCarrier(
        constellation=Constellation.parse(constellation),
        symbol_rate_hz=RATE_HZ / per_symbol,
        **settings,
    )
    cycle = settings.cycle(RATE_HZ, "signal").n_samples
    site = Site(
        sample_rate_hz=RATE_HZ,
        n_samples=cycle * (8000 // cycle + 1),
        seed=1,
        label="x",
        path="signal",
    )
    return settings.build(site)


def error_percent(reception):
    got = samples_of(reception.received).astype(complex)
    sent = samples_of(reception.ideal).astype(complex)
    return 100 * np.sqrt(np.mean(np.abs(got - sent) ** 2) / np.mean(np.abs(sent) ** 2))


@pytest.mark.parametrize("case", CASES)
def test_untouched_carriers_come_back(case) -> None:
    """Unfitted: gain and phase are right too. Tolerance: the claim itself, 0.01 %."""
    per_symbol, settings = CASES[case]
    carrier = build(per_symbol, **settings)
    reception = carrier.receive(carrier, Arrival(n_samples=carrier.n_samples))
    assert error_percent(reception) < 0.01
    assert reception.received.n_samples == carrier.ideal.n_samples
    assert reception.received.sample_rate_hz == carrier.ideal.sample_rate_hz


@pytest.mark.parametrize("case", CASES)
def test_any_cut_gives_the_same_bits(case) -> None:
    per_symbol, settings = CASES[case]
    carrier = build(per_symbol, **settings)
    received = carrier.receive(carrier, Arrival(n_samples=carrier.n_samples)).received
    whole = samples_of(received)
    rng = np.random.default_rng(2)
    for _ in range(6):
        start, stop = np.sort(rng.integers(-20, received.n_samples + 20, 2))
        part = evaluate({received: (int(start), int(stop) + 1)})[received]
        assert np.array_equal(part, whole[np.arange(start, stop + 1) % received.n_samples])


def test_pulses_that_are_not_nyquist_say_what_they_are_compared_with() -> None:
    for case, is_said in (("Gaussian", True), ("default", False)):
        per_symbol, settings = CASES[case]
        carrier = build(per_symbol, **settings)
        remarks = carrier.receive(carrier, Arrival(n_samples=carrier.n_samples)).remarks
        assert any("untouched" in remark for remark in remarks) == is_said


def test_a_pulse_that_bends_between_samples_is_refused() -> None:
    carrier = build(Fraction(10, 3), pulse=HalfSine())
    with pytest.raises(SignalError) as caught:
        carrier.receive(carrier, Arrival(n_samples=carrier.n_samples))
    assert "10/3" in caught.value.problem
