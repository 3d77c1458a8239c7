"""What every member of STAGES and COMBINERS keeps to."""

import dataclasses
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Cycle
from wavegen.meters.seam import seam_figure
from wavegen.sources.noise import Noise
from wavegen.stages import COMBINERS, STAGES
from wavegen.stages.chain import chain_cycle, source_site

N_SAMPLES = 40_009


def length_of(contract, example, n_samples=N_SAMPLES):
    """Return a loop of whole cycles of stage and source, at least as long."""
    rate = contract.examples.RATE_HZ
    own = example.source.cycle(rate, "signal") if example.source else Cycle(n_samples=1)
    cycle = chain_cycle(own, [example.settings], rate, "stages")
    return -(-n_samples // cycle.n_samples) * cycle.n_samples


def source_of(contract, example, n_samples=N_SAMPLES, bandwidth_hz=250_000):
    """Return noise, or what the example wants, at the rate and on the loop before the stage."""
    loop = contract.site(length_of(contract, example, n_samples))
    site = source_site([example.settings], loop)
    if example.source is not None:
        return example.source.build(site)
    bandwidth = min(Fraction(bandwidth_hz), site.sample_rate_hz)
    return Noise(bandwidth_hz=bandwidth).build(site)


def site_of(contract, source, **change):
    rate = contract.examples.RATE_HZ
    n_samples = int(source.n_samples * rate / source.sample_rate_hz)
    return contract.site(n_samples, **({"path": "stages[0]"} | change))


def build(contract, example, settings=None, *, source=None):
    settings = settings or example.settings
    source = source or source_of(contract, dataclasses.replace(example, settings=settings))
    return example.build(settings, site_of(contract, source), source)


@pytest.fixture(scope="module")
def source(contract, stage_example):
    return source_of(contract, stage_example)


@pytest.fixture(scope="module")
def built(contract, stage_example, source):
    return build(contract, stage_example, source=source)


def test_every_member_has_an_example_of_its_own_class(contract):
    assert set(contract.examples.STAGE_EXAMPLES) == set(STAGES) | set(COMBINERS)
    for kind, examples in contract.examples.STAGE_EXAMPLES.items():
        table = STAGES if kind in STAGES else COMBINERS
        assert examples
        assert all(type(example.settings) is table.load(kind) for example in examples)


def test_form(contract, stage_example, built):
    n_samples = length_of(contract, stage_example)
    contract.check_form(built, n_samples=n_samples, rate_hz=contract.examples.RATE_HZ)


def test_cells(contract, built):
    contract.check_cells(built)


def test_workers_and_strips(contract, built):
    contract.check_workers_and_strips(built)


def test_cuts(contract, built):
    contract.check_cuts(built)


def test_pickles(contract, built):
    contract.check_pickles(built)


def test_the_input_is_untouched(contract, stage_example, source):
    before = samples_of(source)
    signal = build(contract, stage_example, source=source)
    samples_of(signal)
    assert samples_of(source).tobytes() == before.tobytes()


def test_it_does_something(built, source):
    assert samples_of(built).tobytes() != samples_of(source).tobytes()


def test_zero_strength_is_identity(contract, stage_example):
    if not stage_example.has_zero_strength:
        return
    if stage_example.identity is None:
        kind = type(stage_example.settings)
        shown = [
            example
            for examples in contract.examples.STAGE_EXAMPLES.values()
            for example in examples
            if type(example.settings) is kind and example.identity is not None
        ]
        assert shown, f"no example of {kind.__name__} shows it at zero strength"
        return
    source = source_of(
        contract, dataclasses.replace(stage_example, settings=stage_example.identity)
    )
    same = build(contract, stage_example, stage_example.identity, source=source)
    assert samples_of(same).tobytes() == samples_of(source).tobytes()
    assert same.mean_power == source.mean_power


def test_nominal_mean_power(contract, stage_example, source, built):
    """As declared: relative to the source's own loop, since a stage makes no data."""
    if stage_example.is_measured:
        assert built.mean_power is None
        return
    assert built.mean_power is not None
    contract.check_mean(built, want=built.mean_power, is_exact=False)
    unknown = dataclasses.replace(source, mean_power=None)
    assert build(contract, stage_example, source=unknown).mean_power is None


def test_the_same_again(contract, stage_example, built):
    again = build(contract, stage_example)
    assert samples_of(again).tobytes() == samples_of(built).tobytes()


def test_the_data_come_from_the_source_alone(contract, stage_example, source, built):
    """What a stage draws itself it draws by seed, label and place, each of which counts."""
    other = {"seed": 99, "label": "other", "path": "stages[5]"}
    before = samples_of(built).tobytes()
    for who in [{key: other[key]} for key in other] if stage_example.is_random else [other]:
        site = site_of(contract, source, **who)
        again = stage_example.build(stage_example.settings, site, source)
        assert (samples_of(again).tobytes() == before) is not stage_example.is_random


@pytest.mark.parametrize("n_samples", [1, 5, 4_096])
def test_short_loops(contract, stage_example, n_samples):
    source = source_of(contract, stage_example, n_samples, bandwidth_hz=10**9)
    signal = build(contract, stage_example, source=source)
    contract.check_cuts(signal)
    assert np.isfinite(samples_of(signal)).all()


def test_the_loop_closes(built):
    """Out-of-band power in a stretch over the seam is what it is anywhere else."""
    assert seam_figure(built).is_clean


def test_settings_are_frozen(stage_example):
    settings = stage_example.settings
    for field in dataclasses.fields(settings):
        with pytest.raises(dataclasses.FrozenInstanceError):
            setattr(settings, field.name, getattr(settings, field.name))


def test_settings_compare_by_value(stage_example):
    assert dataclasses.replace(stage_example.settings) == stage_example.settings
