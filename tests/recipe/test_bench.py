"""What a recipe says of the bench."""

import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.units import QuantityError
from wavegen.recipe.bench import Bench, Generator, PathStage
from wavegen.recipe.load import load_text
from wavegen.recipe.tables import Tables


def stages(*roles: str | None) -> tuple[PathStage, ...]:
    return tuple(PathStage(name=f"s{i}", role=role) for i, role in enumerate(roles))  # type: ignore[arg-type]


def test_a_bench_has_one_device() -> None:
    Bench(average_power_at_device_dbm=-10, path=stages(None, "device", "load"))
    for roles in [(), ("cable",), ("device", "device")]:
        with pytest.raises(QuantityError) as caught:
            Bench(average_power_at_device_dbm=-10, path=stages(*roles))
        assert caught.value.key == "path"


def test_the_bench_of_a_recipe(head: str, tables: Tables) -> None:
    text = f"""{head}signal: {{kind: choosy}}
bench:
  average_power_at_device: -10 dBm
  averaged_over: burst
  path:
    - {{name: cable, gain: -1.2 dB, peak_limit: 33 dBm}}
    - {{name: amplifier, role: device, gain: 30 dB, average_limit: 20 dBm}}
"""
    bench = load_text(text, tables=tables).recipe.bench
    assert bench is not None
    assert bench.average_power_at_device_dbm == -10
    assert bench.averaged_over == "burst"
    assert bench.impedance_ohm == 50
    assert bench.path[0].peak_limit_dbm == 33
    assert bench.path[1].average_limit_dbm == 20
    assert bench.path[1].role == "device"


def test_ratings_of_sensors_analysers_and_the_generator(head: str, tables: Tables) -> None:
    text = f"""{head}signal: {{kind: choosy}}
bench:
  average_power_at_device: -10 dBm
  level_uncertainty: 0.5 dB
  overshoot: 1 dB
  generator: {{peak_limit: 20 dBm, clock_most: 200 MHz, memory: 1000000 samples, word_bits: 14}}
  path:
    - {{name: amplifier, role: device, gain: 30 dB, vswr: 1.5}}
    - {{name: head, role: sensor, energy_limit: 2 uJ, video_bandwidth: 5 MHz}}
    - {{name: box, role: analyser, input_attenuation: 10 dB, mixer_limit: -10 dBm}}
"""
    bench = load_text(text, tables=tables).recipe.bench
    assert bench is not None
    assert bench.path[1].energy_limit_j == pytest.approx(2e-6)
    assert bench.path[2].input_attenuation_db == 10
    assert bench.generator == Generator(
        peak_limit_dbm=20, clock_most_hz=2e8, memory_samples=1_000_000, word_bits=14
    )


@pytest.mark.parametrize(
    "line",
    [
        "{name: head, role: load, energy_limit: 2 uJ}",
        "{name: head, video_bandwidth: 5 MHz}",
        "{name: head, role: sensor, mixer_limit: -10 dBm}",
        "{name: head, vswr: 0.5}",
        "{name: amplifier}",
    ],
)
def test_what_does_not_fit_is_refused_in_its_place(head: str, tables: Tables, line: str) -> None:
    text = f"""{head}signal: {{kind: choosy}}
bench:
  average_power_at_device: -10 dBm
  path:
    - {{name: amplifier, role: device}}
    - {line}
"""
    with pytest.raises(RecipeError) as caught:
        load_text(text, tables=tables)
    assert "bench.path[1]" in str(caught.value)


def test_generator_bounds_that_leave_nothing() -> None:
    with pytest.raises(QuantityError) as caught:
        Generator(clock_least_hz=2.0, clock_most_hz=1.0)
    assert caught.value.key == "clock_most"
