import json


def test_levels_and_peak(call, recipe):
    said = call("predict", recipe())
    assert said.status == 0
    assert "0.0000001 %" in said.out
    assert "highest peak" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_json(call, recipe):
    document = json.loads(call("predict", recipe(), "--json").out)
    assert document["law"]["levels"][0] == {"probability": 0.1, "level_db": 1.9354}
    assert document["no_law"] is None


def test_a_recipe_that_is_missing(call):
    assert call("predict", "nowhere.yaml").status == 3


def test_overrides_count(call, recipe):
    said = call("predict", recipe(), "--set", "signal={kind: tones, count: 2, spacing: 1 MHz}")
    assert "3.01 dB" in said.out


def test_how_long_a_loop_must_be(call, recipe):
    noise = ("--set", "signal={kind: noise, bandwidth: 1 MHz}")
    said = call("predict", recipe(), *noise, "--fault", "0.1dB", "--at", "0.1%")
    assert "is found in 80 % of loops of about" in " ".join(said.out.split())
    assert max(map(len, said.out.splitlines())) <= 80
    document = call(
        "predict", recipe(), *noise, "--fault", "0.2dB", "--at", "0.1%", "--json"
    ).json()
    assert 3e5 < document["fault"]["n_samples"] < 7e5
    assert "any loop shows it" in call("predict", recipe(), "--fault", "1dB", "--at", "1%").out


def test_a_fault_needs_its_probability(call, recipe):
    said = call("predict", recipe(), "--fault", "0.1dB")
    assert said.status == 2
    assert "--at" in said.err


def test_evm_and_aclr_behind_a_clip(call, recipe):
    clip = ("--set", "stages=[{kind: clip, ceiling: 5 dB}]")
    said = call("predict", recipe(), "--set", "signal={kind: noise, bandwidth: 1 MHz}", *clip)
    assert "EVM within the band" in said.out
    assert "ACLR at" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
    carrier = (
        "signal={kind: single_carrier, constellation: qpsk, symbol_rate: 100 kHz, "
        "pulse: {kind: root_raised_cosine, roll_off: 0.22}}"
    )
    assert "EVM and ACLR" in call("predict", recipe(), "--set", carrier, *clip).out


def test_a_length_that_nothing_can_say_is_said(call, recipe):
    noise = (
        "--set",
        "signal={kind: noise, bandwidth: 1 MHz}",
        "--set",
        "stages=[{kind: clip_filter, ceiling: 6 dB}]",
    )
    said = " ".join(call("predict", recipe(), *noise, "--fault", "0.1dB", "--at", "1%").out.split())
    assert "no law" in said
    assert "nothing says how long a loop must be" in said
    assert "how long" not in call("predict", recipe(), *noise).out
    assert "1e-15" in call("predict", recipe(), "--fault", "1dB", "--at", "1e-30").err


def test_levels_rarer_than_the_law_speaks_for_are_marked(call, recipe):
    pattern = (
        "signal={kind: single_carrier, constellation: qpsk, symbol_rate: 100 kHz, "
        "data: {kind: prbs, sequence: pn23}, pulse: {kind: root_raised_cosine, roll_off: 0.22}}"
    )
    out = call("predict", recipe(), "--set", pattern).out
    about = [line.split()[0] for line in out.splitlines() if "about " in line and " dB" in line]
    # 10 of 2^23 - 1: 1.2e-6
    assert about == ["0.0001", "0.00001", "0.000001", "0.0000001"]
    assert "Below 0.000119 % the levels are about right only" in " ".join(out.split())
    assert "about" not in call("predict", recipe()).out
