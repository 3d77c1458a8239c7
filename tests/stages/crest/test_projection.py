import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.stages.channel.gate import on_time
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.crest.projection import Projection

N = 1 << 15


@pytest.fixture(scope="module")
def source(reduction):
    return reduction.banded(N, (-0.1, 0.1, 0))


@pytest.mark.parametrize("rounds", [1, 5, 20])
@pytest.mark.parametrize("ceiling_db", [4.0, 7.0])
def test_the_ceiling_holds_at_every_sample_for_any_rounds(reduction, source, ceiling_db, rounds):
    signal, _ = reduction.build(Projection(ceiling_db=ceiling_db, rounds=rounds), source)
    samples = samples_of(signal)
    # The solver stops at 0.001 dB; roundings are 5e-7.
    assert reduction.papr_db(samples) == pytest.approx(ceiling_db, abs=0.004)
    highest = np.max(np.abs(samples.astype(np.complex128)))
    assert highest <= signal.amplitude * signal.gain * (1 + 6e-7)


@pytest.mark.parametrize("bands", [[(-0.1, 0.1)], [(-0.2, -0.12), (0.05, 0.15)]])
def test_out_of_band_is_unchanged(reduction, bands):
    source = reduction.banded(N, *((low, high, 0) for low, high in bands))
    signal, _ = reduction.build(Projection(ceiling_db=5.5, rounds=20), source)
    edge = 0.02  # of the filter, and of the last gain
    wide = [(low - edge, high + edge) for low, high in bands]
    assert reduction.change_dbc(signal, source, wide) < -100


def test_no_other_method_has_less_error_under_the_same_peak(reduction, source):
    """Rounds of clip and filter end near the optimum, on the far side of it."""
    near, _ = reduction.build(ClipFilter(ceiling_db=5.9, rounds=24), source)
    peak_db = reduction.papr_db(samples_of(near))
    best, _ = reduction.build(Projection(ceiling_db=peak_db, rounds=60), source)
    assert reduction.evm_percent(best, source) < reduction.evm_percent(near, source)


def test_mean_power_is_kept(reduction, source):
    signal, notes = reduction.build(Projection(ceiling_db=4.0, rounds=10), source)
    power = np.abs(samples_of(signal).astype(np.complex128)) ** 2
    assert power.mean() == pytest.approx(1, rel=1e-5)
    (note,) = [note for note in notes if note.where.endswith("ceiling")]
    assert "10 rounds" in note.text
    assert f"{-20 * np.log10(signal.gain):.4f} dB" in note.text


def test_it_is_on_when_its_source_is(reduction, bench):
    gated = bench.given([1, 1, 1j, -1, 0, 0, 0, 0], n_samples=64)
    assert on_time(gated) is None
    source = reduction.banded(N, (-0.1, 0.1, 0))
    signal, _ = reduction.build(Projection(ceiling_db=6.0, rounds=3), source)
    held, corrected = signal, signal.inputs[0]
    assert corrected.acts_on is source
    assert on_time(held) is None  # no gate anywhere, and no error on the way


def test_a_low_peak_is_left(reduction, source):
    ceiling_db = reduction.papr_db(source.samples) + 0.01
    assert reduction.build(Projection(ceiling_db=ceiling_db), source)[0] is source
