import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.distortion import memoryless_chain
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import GatedLaw, MappedLaw, clip_law

GAUSS = GaussianLaw()
A = 10 ** (3 / 20)


def soft(r):
    return 0.5 * r / np.sqrt(1 + r**2) * np.exp(0.2j * r)


def test_a_clip_is_the_clip_of_the_series():
    law = clip_law(GAUSS, 6.08183)  # 6 dB over the input's mean: 0.0818 dB of it are lost
    chain = memoryless_chain(law)
    assert chain.n_steps == 1
    assert chain.gaussian_error_db == 0
    assert chain.mean_shift_db == pytest.approx(-0.0818, abs=1e-4)
    # dsp/clipped_gaussian and the table of published values: gain over RMS of the output.
    step = chain.step()
    assert step.output_power == pytest.approx(1.0, rel=1e-9)
    assert abs(step.gain) == pytest.approx(0.98978 * 10 ** (0.0818 / 20), rel=1e-5)


def test_steps_in_a_row_are_one_curve():
    first = clip_law(GAUSS, 5.0)
    law = MappedLaw(source=first, curve=soft, name="soft")
    again = clip_law(law, 2.5)
    chain = memoryless_chain(again)
    assert (chain.n_steps, chain.base) == (3, GAUSS)
    r = np.linspace(0.01, 4, 50)
    x = np.minimum(r, np.sqrt(first.ratio)) / np.sqrt(first.mean)
    y = soft(x) / np.sqrt(law.mean)
    z = np.minimum(np.abs(y), np.sqrt(again.ratio)) / np.sqrt(again.mean) * np.exp(0.2j * x)
    np.testing.assert_allclose(chain.curve(r), z, rtol=1e-12)
    # Kinks: of the first clip, and where its output reaches the wall of the last.
    assert len(chain.kinks) == 2
    assert chain.kinks[1] == pytest.approx(np.sqrt(first.ratio))
    at = np.abs(chain.curve(np.array(chain.kinks[:1])))[0]
    assert at == pytest.approx(np.sqrt(again.ratio / again.mean), rel=1e-9)
    # Mean over that of the gains at small amplitudes: 1, 0.5 and 1.
    total = 10 * np.log10(first.mean * law.mean / 0.25 * again.mean)
    assert chain.mean_shift_db == pytest.approx(total, abs=1e-5)


def test_of_a_gated_signal_the_on_time_counts():
    gate = GatedLaw(source=GAUSS, duty_fully_on=0.5, ramp=np.empty(0))
    assert (
        memoryless_chain(clip_law(gate, 5.0)).kinks == memoryless_chain(clip_law(GAUSS, 5.0)).kinks
    )
    behind = GatedLaw(source=clip_law(GAUSS, 5.0), duty_fully_on=0.5, ramp=np.empty(0))
    assert memoryless_chain(behind).n_steps == 1


def test_without_steps_there_is_none():
    assert memoryless_chain(GAUSS).n_steps == 0
    assert memoryless_chain(ConstantLaw()).gaussian_error_db == pytest.approx(9.643, abs=1e-3)
