from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Cycle, Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.rotation import Rotation
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

SPACING = Fraction(312500)
QPSK = Constellation.parse("qpsk")


def group(subcarriers, **more) -> Group:
    return Group(
        subcarriers=IndexSet.parse(subcarriers), **({"constellation": QPSK, "level_db": 0.0} | more)
    )


def pilots(subcarriers, values, level_db: float = 0.0) -> Pilots:
    return Pilots(
        subcarriers=IndexSet.parse(subcarriers),
        values=PilotValues.parse(values),
        level_db=level_db,
    )


BASE = Ofdm(
    subcarrier_spacing_hz=SPACING,
    groups=(group("-26..-22, -20..-1, 1..20, 22..26"),),
    pilots=(pilots("-21, 21", [1, -1]),),
    cyclic_prefix=CyclicPrefix.parse("1/4"),
)


def site(n_symbols: int, *, n_fft: int = 64, prefix: int = 16, seed: int = 1) -> Site:
    return Site(
        sample_rate_hz=SPACING * n_fft,
        n_samples=n_symbols * (n_fft + prefix),
        seed=seed,
        label="carrier",
        path="signal",
    )


def carried(signal) -> np.ndarray:
    """FFT of every symbol after its prefix, one prefix for all; shape (n_symbols, n_fft)."""
    n_fft, (prefix,) = signal.layout.n_fft, signal.layout.prefixes
    symbols = samples_of(signal).astype(complex).reshape(-1, n_fft + prefix)
    return np.fft.fft(symbols[:, prefix:], axis=1) / n_fft


def power_db(values: np.ndarray) -> np.ndarray:
    return 10 * np.log10(np.mean(np.abs(values) ** 2, axis=0) + 1e-30)


def test_the_cycle_is_one_pattern() -> None:
    settings = replace(BASE, cyclic_prefix=CyclicPrefix.parse("20 samples, 6 x 16 samples"))
    assert settings.cycle(SPACING * 64, "signal") == Cycle(n_samples=7 * 80 + 4, n_symbols=7)


def test_the_centre_is_empty_unless_listed() -> None:
    without = power_db(carried(BASE.build(site(40))))
    assert without[0] < without[1] - 120
    listed = replace(BASE, groups=(group("-20..20"),))
    levels = power_db(carried(listed.build(site(40))))
    assert abs(levels[0] - levels[1]) < 1e-3


@pytest.mark.parametrize("level_db", [6.0, 2.5, -3.0])
def test_boosted_pilots_stand_at_the_stated_level(level_db) -> None:
    settings = replace(BASE, pilots=(pilots("-21, 21", [1, -1], level_db),))
    levels = power_db(carried(settings.build(site(60))))
    assert np.allclose(levels[[21, -21]] - levels[20], level_db, atol=1e-4)


def test_groups_stand_at_their_levels() -> None:
    settings = replace(BASE, groups=(group("1..10"), group("-10..-1", level_db=-7.0)), pilots=())
    levels = power_db(carried(settings.build(site(60))))
    assert np.allclose(levels[1:11] - levels[-10:].mean(), 7, atol=1e-4)


def test_pilots_are_the_same_in_every_symbol_and_data_are_not() -> None:
    values = carried(BASE.build(site(60)))
    assert np.allclose(values[:, 21], values[0, 21], atol=1e-6)
    assert np.allclose(values[:, -21], -values[:, 21], atol=1e-6)
    assert np.ptp(np.angle(values[:, 20])) > 1


def test_drawn_pilots_follow_the_seed() -> None:
    settings = replace(BASE, pilots=(pilots("-26..-22, 22..26", {"random": "qpsk"}),))
    settings = replace(settings, groups=(group("-20..-1, 1..20"),))
    one, same, other = (carried(settings.build(site(3, seed=s)))[:, 22:27] for s in (1, 1, 2))
    assert np.array_equal(one, same)
    assert not np.allclose(one, other, atol=1e-3)
    assert np.allclose(one, one[0], atol=1e-6)
    assert np.ptp(np.angle(one[0])) > 1


def test_equal_pilots_are_reported() -> None:
    place = site(3)
    BASE.build(place)
    assert not place.notes
    equal = replace(BASE, pilots=(pilots("-21, 21", [1]),))
    equal.build(place)
    (note,) = place.notes
    assert (note.kind, note.where) == ("warning", "signal.pilots[0].values")


def test_groups_draw_their_own_data() -> None:
    settings = replace(BASE, groups=(group("1..10"), group("-10..-1")), pilots=())
    values = carried(settings.build(site(500)))
    pairs = np.vdot(values[:, 1:11], values[:, -10:]) / (np.abs(values[0, 1]) ** 2 * 5000)
    assert abs(pairs) < 5 / np.sqrt(5000)  # 5 sigma of 5000 independent pairs


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"groups": ()}, "groups"),
        ({"groups": (group("30..32"),)}, "groups[0].subcarriers"),
        ({"groups": (group("-33..-30"),)}, "groups[0].subcarriers"),
        ({"groups": (group("1..5, 5..6"),)}, "groups[0].subcarriers"),
        ({"groups": (group("1..5"), group("5..9"))}, "groups[1].subcarriers"),
        ({"pilots": (pilots("20..22", [1, -1]),)}, "pilots[0].subcarriers"),
        ({"pilots": (pilots("-21", [0, 1]),)}, "pilots[0].values"),
        (
            {"groups": (Group(subcarriers=IndexSet(()), constellation=QPSK),)},
            "groups[0].subcarriers",
        ),
        ({"subcarrier_spacing_hz": Fraction(300000)}, "subcarrier_spacing"),
        ({"cyclic_prefix": CyclicPrefix.parse("1/3")}, "cyclic_prefix"),
        ({"edge_window": Stretch.parse("17 samples")}, "edge_window"),
    ],
)
def test_what_cannot_be_honoured_is_an_error_at_its_key(change, key) -> None:
    settings = replace(BASE, pilots=()) if "groups" in change else BASE
    with pytest.raises(RecipeError) as caught:
        replace(settings, **change).build(site(10))
    assert caught.value.where == f"signal.{key}"
    assert caught.value.allowed
    assert caught.value.remedy


def test_the_lowest_and_the_highest_subcarrier_can_be_used() -> None:
    settings = replace(BASE, groups=(group("-32, 31"),), pilots=())
    levels = power_db(carried(settings.build(site(10))))
    assert np.allclose(levels[[31, 32]], levels[31], atol=1e-3)
    assert np.all(np.delete(levels, [31, 32]) < levels[31] - 120)


def test_a_loop_that_cuts_a_symbol_is_refused() -> None:
    with pytest.raises(RecipeError):
        BASE.build(replace(site(10), n_samples=801))


def test_pilots_alone_have_exactly_unit_power() -> None:
    # Nothing is random, so that the expected mean is the mean: float32 rounding remains.
    settings = replace(
        BASE,
        groups=(),
        pilots=(pilots("-9..-1, 1..9 by 2", [1, [0.3, 1], -2], 4.0),),
        cyclic_prefix=CyclicPrefix.parse("12 samples, 9 samples"),
        edge_window=Stretch.parse("9 samples"),
    )
    n = settings.cycle(SPACING * 64, "signal").n_samples
    x = samples_of(settings.build(replace(site(1), n_samples=7 * n))).astype(complex)
    assert abs(np.mean(np.abs(x) ** 2) - 1) < 1e-6


def test_mean_power_is_one_on_average() -> None:
    # Long edge, few subcarriers, strong pilots and a constellation that is not centred, so that
    # a slip in the prefix or the window shows. The pilots' share of each symbol is fixed.
    lopsided = Constellation.of_points([[1, 0], [0, 1]])
    settings = replace(
        BASE,
        groups=(group("-4..4", constellation=lopsided),),
        pilots=(pilots("6, 7", [1, [0, 1]], 3.0),),
        cyclic_prefix=CyclicPrefix.parse("8 samples, 12 samples"),
        edge_window=Stretch.parse("8 samples"),
    )
    n = settings.cycle(SPACING * 16, "signal").n_samples
    n_batches, n_patterns = 200, 500
    place = replace(site(1, n_fft=16), n_samples=n * n_batches * n_patterns)
    x = samples_of(settings.build(place)).astype(complex)
    means = np.mean(np.abs(x.reshape(n_batches, -1)) ** 2, axis=1)
    sigma = means.std() / np.sqrt(n_batches)
    assert sigma < 6e-4  # so that the 3 % that the window takes could not hide
    assert abs(means.mean() - 1) < 4 * sigma
    # taking no account of window and prefix would put the mean here:
    plain = settings.build(place).inputs[0].mean_power
    assert plain is not None
    assert abs(plain - 1) > 0.02


def test_an_edge_lowers_what_lies_out_of_band_and_keeps_the_loop_closed() -> None:
    def spectrum(edge: str) -> np.ndarray:
        settings = replace(BASE, groups=(group("-60..-1, 1..60"),), pilots=())
        settings = replace(settings, edge_window=Stretch.parse(edge))
        x = samples_of(settings.build(site(64, n_fft=512, prefix=128))).astype(complex)
        return np.abs(np.fft.fft(x) / x.size) ** 2

    rough, smooth = spectrum("0 samples"), spectrum("64 samples")
    n = rough.size
    spacing = n // 512
    far = slice(120 * spacing, n - 120 * spacing)  # twice the occupied band and beyond
    in_band = np.r_[0 : 60 * spacing, n - 60 * spacing : n]
    assert np.isclose(rough[in_band].sum(), smooth[in_band].sum(), rtol=0.01)
    # Derivation: the edge multiplies sidelobes at f by cos(pi f E) / (1 - (2 f E)^2), E its
    # length; at 120 spacings and E = 1/8 useful symbol that is 1/900 in amplitude or less.
    assert 10 * np.log10(rough[far].sum() / smooth[far].sum()) > 50


def on(symbols) -> SymbolSet:
    return SymbolSet.parse(symbols)


SHARED = replace(
    BASE,
    groups=(group("1..20", symbols=on("0, 2")), group("1..20", symbols=on(1))),
    pilots=(replace(pilots("1, 20", [1, -1], 3.0), symbols=on(3)),),
    frame_symbols=5,
)


@pytest.mark.parametrize(
    ("prefix", "frame", "n_symbols"),
    [("1/4", None, 1), ("1/4", 5, 5), ("20 samples, 6 x 16 samples", 14, 14), ("7 x 1/4", 5, 5)],
)
def test_the_cycle_holds_whole_patterns_and_whole_frames(prefix, frame, n_symbols) -> None:
    settings = replace(BASE, cyclic_prefix=CyclicPrefix.parse(prefix), frame_symbols=frame)
    found = settings.cycle(SPACING * 64, "signal")
    assert found.n_symbols == n_symbols
    extra = 4 * n_symbols // 7 if "20" in prefix else 0
    assert found.n_samples == 80 * n_symbols + extra


def test_the_prefixes_as_listed_are_the_frame_unless_it_is_given() -> None:
    settings = replace(SHARED, frame_symbols=None, cyclic_prefix=CyclicPrefix.parse("7 x 1/4"))
    assert settings.cycle(SPACING * 64, "signal").n_symbols == 7
    values = carried(settings.build(site(14)))
    assert np.all(power_db(values[[4, 5, 6, 11, 12, 13]]) < -200)


def test_a_cycle_too_long_is_refused() -> None:
    settings = replace(
        SHARED, frame_symbols=9999, cyclic_prefix=CyclicPrefix.parse("20 samples, 16 x 16 samples")
    )
    with pytest.raises(RecipeError) as caught:
        settings.cycle(SPACING * 64, "signal")
    assert caught.value.where == "signal.frame"
    assert "169983 symbols" in caught.value.problem


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"frame_symbols": 3}, "pilots[0].symbols"),
        ({"frame_symbols": None}, "groups[0].symbols"),
        ({"groups": (group("1..20", symbols=on("0..2")), group("3"))}, "groups[1].subcarriers"),
        ({"groups": (group("1..5", symbols=on("3")),)}, "pilots[0].subcarriers"),
    ],
)
def test_schedules_that_cannot_be_are_errors_at_their_key(change, key) -> None:
    with pytest.raises(RecipeError) as caught:
        replace(SHARED, **change).build(site(30))
    assert caught.value.where == f"signal.{key}"


def test_shared_subcarriers_and_silence() -> None:
    place = site(50)
    signal = SHARED.build(place)
    assert [note.kind for note in place.notes] == ["info"]
    values = carried(signal).reshape(10, 5, 64)
    assert not values[:, 4].any()
    assert np.allclose(np.abs(values[:, :3, 1:21]), np.abs(values[0, 0, 1]), rtol=1e-5)
    assert np.allclose(values[:, 3, 1] / np.abs(values[0, 0, 1]), 10**0.15, rtol=1e-5)
    n_on = samples_of(signal.ideal).reshape(50, -1).any(axis=1).sum()
    assert n_on == 40
    assert signal.mean_power == 1


def test_mean_power_of_a_schedule_is_one_on_average() -> None:
    # As above: few subcarriers, a constellation off its centre, a long edge; now with spreading,
    # rotation, a shift by half a subcarrier, boosted pilots and a silent symbol.
    lopsided = Constellation.of_points([[1, 0], [0, 1]])
    settings = replace(
        BASE,
        groups=(
            group("-4..4", constellation=lopsided, symbols=on("0, 2"), spreading="dft"),
            group("-2..3", constellation=lopsided, symbols=on(1), rotation=Rotation.parse("pi/3")),
        ),
        pilots=(replace(pilots("6, 7", [1, [0, 1]], 3.0), symbols=on("0..1, 3")),),
        cyclic_prefix=CyclicPrefix.parse("8 samples, 12 samples"),
        edge_window=Stretch.parse("8 samples"),
        frame_symbols=5,
        half_subcarrier_shift=True,
    )
    n = settings.cycle(SPACING * 16, "signal").n_samples
    n_batches, n_cycles = 200, 100
    where = replace(site(1, n_fft=16), n_samples=n * n_batches * n_cycles)
    x = samples_of(settings.build(where)).astype(complex)
    means = np.mean(np.abs(x.reshape(n_batches, -1)) ** 2, axis=1)
    sigma = means.std() / np.sqrt(n_batches)
    assert sigma < 6e-4
    assert abs(means.mean() - 1) < 4 * sigma
