"""What every member of SOURCES keeps to."""

import dataclasses
from fractions import Fraction

import pytest

from wavegen.core.render import samples_of
from wavegen.meters.seam import seam_figure
from wavegen.sources import SOURCES


@pytest.fixture(scope="module")
def built(contract, source_example):
    n_samples = contract.loop_of(source_example)
    return source_example.settings.build(contract.site(n_samples))


def test_every_member_has_an_example_of_its_own_class(contract):
    assert set(contract.examples.SOURCE_EXAMPLES) == set(SOURCES)
    for kind, examples in contract.examples.SOURCE_EXAMPLES.items():
        assert examples
        assert all(type(example.settings) is SOURCES.load(kind) for example in examples)


def test_form(contract, source_example, built):
    n_samples = contract.loop_of(source_example)
    contract.check_form(built, n_samples=n_samples, rate_hz=contract.examples.RATE_HZ)


def test_cells(contract, built):
    contract.check_cells(built)


def test_workers_and_strips(contract, built):
    contract.check_workers_and_strips(built)


def test_cuts(contract, built):
    contract.check_cuts(built)


def test_pickles(contract, built):
    contract.check_pickles(built)


def test_unit_mean_power(contract, source_example, built):
    assert built.mean_power == pytest.approx(1.0, rel=1e-12)
    if source_example.is_exact:
        contract.check_mean(built, want=1.0, is_exact=True)
    elif source_example.least_samples >= 10_000:
        contract.check_mean(built, want=1.0, is_exact=False)


def test_the_same_again(contract, source_example, built):
    n_samples = contract.loop_of(source_example)
    again = source_example.settings.build(contract.site(n_samples, path="elsewhere"))
    assert samples_of(again).tobytes() == samples_of(built).tobytes()


@pytest.mark.parametrize("change", [{"seed": 2}, {"label": "another"}])
def test_seed_and_label_choose_the_data(contract, source_example, built, change):
    n_samples = contract.loop_of(source_example)
    other = source_example.settings.build(contract.site(n_samples, **change))
    is_same = samples_of(other).tobytes() == samples_of(built).tobytes()
    assert is_same != source_example.is_random


def test_several_cycles_make_a_loop(contract, source_example):
    cycle = source_example.settings.cycle(contract.examples.RATE_HZ, "signal")
    assert cycle.n_samples >= 1
    assert cycle.n_symbols >= 0
    n_samples = contract.loop_of(source_example, times=3)
    signal = source_example.settings.build(contract.site(n_samples))
    assert signal.n_samples == n_samples
    assert samples_of(signal, n_samples - 3, n_samples + 3).tobytes() == (
        samples_of(signal, -3, 3).tobytes()
    )


def test_the_cycle_does_not_depend_on_the_unit_of_rate(contract, source_example):
    """Rates are exact: asked twice, and as a ratio of larger numbers, the cycle is the same."""
    rate = contract.examples.RATE_HZ
    first = source_example.settings.cycle(rate, "signal")
    assert source_example.settings.cycle(Fraction(rate * 7, 7), "signal") == first


def test_the_loop_closes(contract, source_example, built):
    """Out-of-band power in a stretch over the seam is what it is anywhere else."""
    cycle = source_example.settings.cycle(contract.examples.RATE_HZ, "signal")
    assert seam_figure(built, cycle_samples=cycle.n_samples).is_clean


def test_settings_are_frozen(source_example):
    settings = source_example.settings
    for field in dataclasses.fields(settings):
        with pytest.raises(dataclasses.FrozenInstanceError):
            setattr(settings, field.name, getattr(settings, field.name))
    with pytest.raises((AttributeError, TypeError)):
        settings.something_else = 1


def test_settings_compare_by_value(source_example):
    assert dataclasses.replace(source_example.settings) == source_example.settings


def test_building_leaves_settings_alone(contract, source_example):
    before = repr(source_example.settings)
    source_example.settings.build(contract.site(contract.loop_of(source_example)))
    assert repr(source_example.settings) == before
