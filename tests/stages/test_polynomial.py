from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError, SignalError
from wavegen.core.render import samples_of
from wavegen.stages.coefficients import Coefficients, Term
from wavegen.stages.polynomial import WithMemory, drive_polynomial, reach_of, steady_curve

TERMS = (
    Term(1, 0, 0, 1 + 0.1j),
    Term(1, 2, 0, 0.1j),
    Term(2, 0, 0, -0.05 + 0j),
    Term(3, 0, 0, -0.2 + 0.1j),
    Term(3, 0, 3, 0.04 + 0.01j),
    Term(3, 1, -4, -0.03j),
    Term(7, 1, 0, 0.02 + 0j),
)


def coefficients(terms=TERMS, **fields):
    return Coefficients(name="a.csv", terms=terms, **fields)


def build(bench, source, made, back_off_db=12.0, back_off_from="full_scale"):
    site = bench.site(source.n_samples)
    signal = drive_polynomial(
        site, source, made, back_off_db=back_off_db, back_off_from=back_off_from
    )
    return signal, site.notes


def expected(x, terms):
    """Return the sum as it is written, on a cyclic array."""
    total = np.zeros(x.size, np.complex128)
    for order, delay, lag, value in terms:
        total += value * np.roll(x, delay) * np.abs(np.roll(x, delay + lag)) ** (order - 1)
    return total


def test_samples_follow_the_sum(bench):
    source = bench.gaussian(30_000)
    signal, _ = build(bench, source, coefficients())
    x = samples_of(source).astype(np.complex128)
    mean = np.mean(np.abs(x) ** 2)
    want = expected(x * 10**-0.6 / np.sqrt(mean), TERMS)
    want *= np.sqrt(mean / np.mean(np.abs(want) ** 2))
    np.testing.assert_allclose(samples_of(signal), want, rtol=2e-6, atol=2e-6)
    assert signal.mean_power == source.mean_power
    assert signal.needs(10, 20) == ((10 - reach_of(TERMS)[0], 20 + reach_of(TERMS)[1]),)


def test_reach():
    assert reach_of(TERMS) == (3, 3)
    assert reach_of((Term(1, 5, 0, 1j),)) == (5, 0)


def test_it_is_told(bench):
    _, notes = build(bench, bench.gaussian(30_000), coefficients())
    texts = [note.text for note in notes]
    assert "no sample_rate" in texts[0]
    assert "12.000 dB below its largest amplitude" in texts[1]
    assert "order 7 spreads the band to 7 times" in texts[2]
    assert notes[2].kind == "warning"  # white samples: everything folds


def test_another_rate_is_refused(bench):
    source = bench.gaussian(100)
    build(bench, source, coefficients(sample_rate_hz=Fraction(1_000_000)))
    with pytest.raises(RecipeError) as caught:
        build(bench, source, coefficients(sample_rate_hz=Fraction(2_000_000)))
    assert caught.value.where == "stages[0].path"


def test_a_peak_beyond_the_largest_amplitude_is_refused(bench):
    with pytest.raises(RecipeError) as caught:
        build(bench, bench.gaussian(30_000), coefficients(), back_off_db=5.0)
    assert "beyond the largest input" in caught.value.problem
    build(bench, bench.gaussian(30_000), coefficients(largest_amplitude=2.0), back_off_db=11.0)
    source = bench.gaussian(100)
    made = WithMemory(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=100,
        inputs=(source,),
        coefficients=coefficients(),
        drive=3.0,
        scale=1.0,
        where="stages[0]",
    )
    with pytest.raises(SignalError):
        samples_of(made)


def test_steady_curve_adds_the_delays():
    curve = steady_curve(coefficients())
    r = np.array([0.0, 0.4])
    want = (1 + 0.2j) - 0.05 * r + (-0.16 + 0.08j) * r**2 + 0.02 * r**6
    np.testing.assert_allclose(curve.gain(r), want, atol=1e-15)


def test_back_off_from_the_compression_of_a_carrier(bench):
    made = coefficients((Term(1, 0, 0, 1 + 0j), Term(3, 0, 0, -0.2 + 0j)))
    steady = steady_curve(made)
    assert steady.compression == pytest.approx(np.sqrt((1 - 10**-0.05) / 0.2), rel=1e-9)
    signal, _ = build(bench, bench.given([1, 1j]), made, 3.0, "compression")
    assert signal.drive == pytest.approx(steady.compression * 10**-0.15, rel=1e-6)
    linear = coefficients((Term(1, 0, 0, 1 + 0j), Term(1, 1, 0, 0.1 + 0j)))
    with pytest.raises(RecipeError):
        build(bench, bench.given([1, 1j]), linear, 3.0, "compression")


def test_a_plain_gain_and_silence(bench):
    source = bench.gaussian(100)
    plain = coefficients((Term(1, 0, 0, 2j), Term(3, 0, 0, 0j)))
    assert build(bench, source, plain)[0] is source
    with pytest.raises(RecipeError):
        build(bench, bench.given([0, 0]), coefficients())
