import argparse

import pytest

from wavegen.cli import measure_options as options


@pytest.mark.parametrize(
    ("text", "value"), [("0.0001", 1e-4), ("0.01%", 1e-4), ("1e-6", 1e-6), ("1/1000", 1e-3)]
)
def test_probabilities(text, value):
    assert options.probability(text) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize("text", ["0", "1", "-0.1", "100%", "1dB", "often", "1e-20"])
def test_no_probabilities(text):
    with pytest.raises(argparse.ArgumentTypeError):
        options.probability(text)


def test_levels():
    assert options.level("6dB") == (6.0, "dB")
    assert options.level("-20 dBFS") == (-20.0, "dBFS")
    assert options.level("1.5dBm") == (1.5, "dBm")


@pytest.mark.parametrize("text", ["6", "6 dbm", "6 Hz", "1e9 dB", "loud"])
def test_no_levels(text):
    with pytest.raises(argparse.ArgumentTypeError):
        options.level(text)


def test_gates():
    assert [options.gate(text) for text in ("auto", "markers", "1100")] == [
        "auto",
        "markers",
        "1100",
    ]


@pytest.mark.parametrize("text", ["", "on", "1111", "0", "10 10", "1" * 9999 + "02"])
def test_no_gates(text):
    with pytest.raises(argparse.ArgumentTypeError):
        options.gate(text)


@pytest.mark.parametrize("text", ["-1 ms", "5", "1 MHz"])
def test_no_times(text):
    with pytest.raises(argparse.ArgumentTypeError):
        options.span(text)


def parsed(*words):
    parser = argparse.ArgumentParser()
    options.add_levels(parser)
    options.add_gate(parser)
    options.add_sensor(parser)
    return options.settings_of(parser.parse_args(words))


def test_nothing_asked():
    settings = parsed()
    assert settings.gate is settings.sensor is None
    assert settings.states_process
    assert settings.finds_faults


def test_everything_asked():
    settings = parsed(
        *("--at", "1e-5", "--at", "5%", "--above", "3dB", "--rf", "--remove-dc", "--gate", "auto"),
        *("--threshold=-10dB", "--hysteresis", "2dB", "--dead-time", "1us", "--guard", "2us"),
        *("--shortest-burst", "3us", "--gate-window", "4us", "--bursts", "each"),
        *("--edges", "crossing"),
        *("--video-bandwidth", "5MHz", "--video-shape", "brick-wall", "--sensor-rate", "1MHz"),
    )
    assert settings.probabilities == (1e-5, 0.05)
    assert not parsed("--no-faults").finds_faults
    assert settings.above[0].unit == "dB"
    assert settings.removes_offset
    assert settings.shows_rf
    gate = settings.gate
    assert (gate.by, gate.threshold_db, gate.hysteresis_db, gate.each) == ("level", -10, 2, True)
    assert gate.edges == "crossing"
    times = (gate.dead_time, gate.guard, gate.shortest, gate.window)
    assert [str(item) for item in times] == ["1 us", "2 us", "3 us", "4 us"]
    assert settings.sensor.shape == "brick_wall"


def test_a_pattern():
    gate = parsed("--gate", "1100", "--slot", "0.5ms", "--gate-delay", "1ms").gate
    assert (gate.by, gate.pattern, str(gate.slot), str(gate.delay)) == (
        "pattern", "1100", "0.5 ms", "1 ms",
    )  # fmt: skip
    assert parsed("--gate", "markers", "--marker", "burst on").gate.label == "burst on"
