import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.meters.evm_probe import measure_evm
from wavegen.production.graph import check_names, shortest_cycle
from wavegen.production.prepare import prepare


def parts(*items):
    return "signal:\n  kind: sum\n  parts:\n" + "".join(f"  - {{{item}}}\n" for item in items)


@pytest.fixture
def two(lab):
    def build(first="", second=""):
        signals = [f"{item}signal: {{{lab.QPSK}{data}}}" for item, data in (first, second)]
        return lab.prepared(lab.HEAD + parts(*signals)).built

    return build


def test_unshared_data_differ_and_shared_are_equal_bit_for_bit(two):
    own = two(("name: a, ", ""), ("name: b, ", ""))
    shared = two(("name: a, ", ""), ("name: b, ", ", data: {share: a}"))
    a, b = (samples_of(part.signal) for part in own.parts)
    c, d = (samples_of(part.signal) for part in shared.parts)
    assert [part.name for part in own.parts] == ["a", "b"]
    assert [part.path for part in own.parts] == ["signal.parts[0]", "signal.parts[1]"]
    assert abs(np.vdot(a, b)) < 0.2 * a.size  # 2000 symbols: 1/sqrt(2000) = 0.022 rms
    assert np.array_equal(c, d)
    assert np.array_equal(a, c)


def test_unnamed_parts_draw_their_own_data(two):
    first, second = two(("", ""), ("", "")).parts
    assert (first.name, second.name) == ("signal.parts[0]", "signal.parts[1]")
    assert not np.array_equal(samples_of(first.signal), samples_of(second.signal))


def test_a_part_keeps_its_data_when_another_is_added(lab):
    alone = lab.prepared(lab.HEAD + parts(f"name: a, signal: {{{lab.QPSK}}}")).built
    beside = lab.prepared(
        lab.HEAD + parts("signal: {kind: carrier}", f"name: a, signal: {{{lab.QPSK}}}")
    ).built
    assert np.array_equal(samples_of(alone.parts[0].signal), samples_of(beside.parts[1].signal))


def test_a_name_taken_twice(lab):
    text = lab.HEAD + parts("name: a, signal: {kind: carrier}", "name: a, signal: {kind: carrier}")
    with pytest.raises(RecipeError) as caught:
        lab.prepared(text)
    assert "signal.parts[1].name" in caught.value.where
    assert "case.yaml:8:" in caught.value.where
    assert "'a'" in caught.value.problem


def test_a_name_taken_in_a_nested_sum(lab):
    inner = "{kind: sum, parts: [{name: a, signal: {kind: carrier}}]}"
    text = lab.HEAD + parts("name: a, signal: {kind: carrier}", f"signal: {inner}")
    with pytest.raises(RecipeError) as caught:
        lab.prepared(text)
    assert "signal.parts[1].signal.parts[0].name" in caught.value.where


@pytest.mark.parametrize(("share", "hint"), [("bridgge", "bridge"), ("qqq", "")])
def test_data_of_a_part_that_is_not_there(lab, share, hint):
    text = lab.HEAD + parts(
        "name: bridge, signal: {kind: carrier}",
        f"signal: {{{lab.QPSK}, data: {{share: {share}}}}}",
    )
    with pytest.raises(RecipeError) as caught:
        lab.prepared(text)
    assert caught.value.where.endswith("signal.parts[1].signal.data.share")
    assert repr(share) in caught.value.problem
    assert "bridge" in caught.value.allowed
    assert hint in caught.value.remedy


def test_data_shared_where_no_part_has_a_name(lab):
    with pytest.raises(RecipeError) as caught:
        lab.prepared(lab.HEAD + f"signal: {{{lab.QPSK}, data: {{share: a}}}}\n")
    assert caught.value.where.endswith("signal.data.share")


def test_nested_parts_come_in_the_order_of_the_recipe(lab):
    inner = "{kind: sum, parts: [{signal: {kind: carrier}}, {signal: {kind: carrier}}]}"
    built = lab.prepared(
        lab.HEAD + parts(f"signal: {inner}", "signal: {kind: noise, bandwidth: 1 MHz}")
    ).built
    assert [part.path for part in built.parts] == [
        "signal.parts[0]",
        "signal.parts[0].signal.parts[0]",
        "signal.parts[0].signal.parts[1]",
        "signal.parts[1]",
    ]


def test_the_sum_closes_when_all_its_parts_do(lab):
    tones = "signal: {kind: tones, count: 3, spacing: 30 kHz}"
    recipe = lab.load(lab.HEAD + parts(f"signal: {{{lab.QPSK}}}", tones)).recipe
    cycle = shortest_cycle(recipe.signal, recipe.sample_rate_hz, "signal")
    # 4 samples a symbol; 30 kHz closes in 400 samples at 4 MHz (12 cycles of 100/3 us).
    assert cycle.n_samples % 4 == 0
    assert (30_000 * cycle.n_samples) % 4_000_000 == 0
    assert cycle.n_symbols == 0


def test_parts_with_the_same_symbols_keep_them(lab):
    recipe = lab.load(lab.HEAD + parts(f"signal: {{{lab.QPSK}}}", f"signal: {{{lab.QPSK}}}")).recipe
    cycle = shortest_cycle(recipe.signal, recipe.sample_rate_hz, "signal")
    assert (cycle.n_samples, cycle.n_symbols) == (4, 1)


def test_stages_run_in_order_on_the_part_and_on_the_sum(lab):
    scale = "stages: [{kind: scale, gain: -6 dB}, {kind: scale, gain: -4 dB}]"
    built = lab.prepared(
        lab.HEAD
        + parts(f"signal: {{kind: carrier}}, {scale}")
        + "stages: [{kind: scale, gain: 3 dB}]"
    ).built
    assert built.parts[0].signal.mean_power == pytest.approx(0.1)
    # The sum is normalised to 1 again; then 3 dB.
    assert np.mean(np.abs(samples_of(built.signal)) ** 2) == pytest.approx(10**0.3, rel=1e-6)


def test_check_names_passes_what_is_right(lab):
    check_names({"signal": lab.load(lab.SINGLE).recipe.signal})


def test_prepare_resolves_errors_to_the_line(lab):
    text = lab.HEAD.replace("2 ms", "10 symbols") + "signal: {kind: carrier}\n"
    with pytest.raises(RecipeError) as caught:
        prepare(lab.load(text))
    assert caught.value.where.startswith("case.yaml:3:")


OFDM = (
    "{kind: ofdm, subcarrier_spacing: 15.625 kHz, cyclic_prefix: 1/16, "
    'groups: [{subcarriers: "-20..-1, 1..20", constellation: qpsk}]}'
)


def test_methods_on_symbols_act_inside_a_sum_under_the_stages_of_their_part(lab):
    stage = "stages: [{kind: selected_mapping, candidates: 4}]"
    first, second = (
        lab.prepared(
            lab.HEAD
            + parts(
                f"name: a, frequency_offset: 703.125 kHz, signal: {OFDM}{more}",
                "signal: {kind: carrier}",
            )
        ).built
        for more in ("", f", {stage}")
    )
    assert not np.array_equal(*(samples_of(each.parts[0].signal) for each in (first, second)))
    (result,) = measure_evm(second.signal)
    assert result.path == "parts[0]"
    assert result.percent < 1  # of the carrier, nearly on the grid; not turned back: over 100 %


@pytest.mark.parametrize(
    ("text", "word"),
    [
        (parts(f"signal: {OFDM}", "signal: {kind: carrier}"), "a sum"),
        (f"signal: {OFDM}\n", "changed the waveform"),
        ("signal: {kind: carrier}\n", "has none"),
    ],
)
def test_methods_on_symbols_are_refused_elsewhere_at_their_line(lab, text, word):
    before = "{kind: clip, ceiling: 5 dB}, " if "changed" in word else ""
    stages = f"stages: [{before}{{kind: constellation_extension, ceiling: 6 dB}}]\n"
    with pytest.raises(RecipeError) as caught:
        lab.prepared(lab.HEAD + text + stages)
    assert f"stages[{int(bool(before))}].kind" in caught.value.where
    assert "case.yaml:" in caught.value.where
    assert word in caught.value.problem
