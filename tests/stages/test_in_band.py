import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.stages.channel.scale import Scaled
from wavegen.stages.crest.clip import Clipped
from wavegen.stages.in_band import InBand, Method, reduce_in_band, repeat_rounds

N = 1 << 14


def clips(source, seen):
    """Return the maker of a bare clip, which notes the band that it is given."""

    def method(filled):
        seen.append(filled)

        def process(amplitude, gain):
            return Clipped(
                sample_rate_hz=source.sample_rate_hz,
                n_samples=source.n_samples,
                inputs=(source,),
                mean_power=None,
                amplitude=amplitude,
                gain=gain,
                origin="test",
            )

        return Method(process=process, action="clips", halo=3)

    return method


def test_a_method_is_given_the_band_and_meets_its_ceiling(reduction, bench):
    source, seen = reduction.banded(N, (-0.1, 0.15, 0)), []
    here = bench.site(N)
    signal = reduce_in_band(here, source, InBand(ceiling_db=5.0), clips(source, seen))
    assert reduction.papr_db(samples_of(signal)) == pytest.approx(5.0, abs=0.004)
    assert seen[0].oversampling == pytest.approx(4, rel=0.02)
    assert here.notes[-1].text.startswith("clips at")


def test_nothing_to_do_and_nothing_there(reduction, bench):
    source = reduction.banded(N, (-0.1, 0.1, 0))
    assert reduce_in_band(bench.site(N), source, InBand(ceiling_db=30), clips(source, [])) is source
    silent = bench.given([0], n_samples=N)
    with pytest.raises(RecipeError) as caught:
        reduce_in_band(bench.site(N), silent, InBand(ceiling_db=3), clips(silent, []))
    assert caught.value.where == "stages[0].ceiling"


def test_the_last_round_has_the_gain_and_the_mean(bench):
    source = bench.given([1, 1j], n_samples=8)

    def one(source, *, mean_power, gain):
        return Scaled(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=mean_power,
            gain=2.0 * gain,
        )

    made = repeat_rounds(source, 3, one, 0.5)
    assert samples_of(made).tolist() == [4, 4j] * 4
    assert made.mean_power == source.mean_power
    assert made.inputs[0].mean_power is None
    assert made.inputs[0].inputs[0].inputs[0] is source
    assert np.all(samples_of(repeat_rounds(source, 1, one, 1.0)) == 2 * samples_of(source))
