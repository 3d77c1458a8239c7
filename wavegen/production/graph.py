"""From checked settings to a graph of signals: cycles, names, shared data, chains of stages."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field, fields, is_dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.errors import RecipeError
from wavegen.core.registry import nearest
from wavegen.core.signal import Signal
from wavegen.core.site import Cycle, Site, common_cycle
from wavegen.stages.chain import build_chain, chain_cycle, rates_of, source_site


@dataclass(frozen=True, slots=True)
class BuiltPart:
    """One part of a sum, at the level that its source and stages give it.

    Parameters
    ----------
    path : str
        Path in the recipe: ``signal.parts[0]``.
    name : str
        The part's own name, else its path.
    signal : Signal
        The part after its stages, before the sum shifts and weighs it.
    """

    path: str
    name: str
    signal: Signal


@dataclass(frozen=True, slots=True)
class Built:
    """A recipe's graph.

    Parameters
    ----------
    signal : Signal
        What is rendered.
    parts : list of BuiltPart
        Every part of every sum, in the order of the recipe.
    """

    signal: Signal
    parts: list[BuiltPart] = field(default_factory=list)


def is_combiner(settings: Any) -> bool:
    """Return whether settings combine several signals."""
    return hasattr(settings, "combine")


def shortest_cycle(
    settings: Any,
    sample_rate_hz: Fraction,
    path: str,
    stages: tuple[Any, ...] = (),
    stages_path: str = "stages",
) -> Cycle:
    """Return the shortest loop of a source, or of all parts of a sum together.

    Parameters
    ----------
    settings : source or combiner settings
    sample_rate_hz : Fraction
        Rate behind the last stage, Hz.
    path : str
        Path in the recipe.
    stages : tuple of stage settings
        What follows it; gates and changes of rate lengthen the loop.
    stages_path : str
        Their path in the recipe.

    Returns
    -------
    Cycle
        ``n_symbols`` is 0 unless all parts have symbols of one length.

    Raises
    ------
    RecipeError
        As raised by a source or a stage.
    """
    if stages:
        cycle = shortest_cycle(settings, rates_of(stages, sample_rate_hz)[0], path)
        return chain_cycle(cycle, stages, sample_rate_hz, stages_path)
    if not is_combiner(settings):
        made: Cycle = settings.cycle(sample_rate_hz, path)
        return made
    cycles = [
        shortest_cycle(
            part.signal,
            sample_rate_hz,
            f"{path}.parts[{number}].signal",
            part.stages,
            f"{path}.parts[{number}].stages",
        )
        for number, part in enumerate(settings.parts)
    ]
    n_samples = common_cycle([cycle.n_samples for cycle in cycles])
    rates = {Fraction(cycle.n_symbols, cycle.n_samples) for cycle in cycles}
    n_symbols = n_samples * rates.pop() if len(rates) == 1 else Fraction(0)
    return Cycle(n_samples=n_samples, n_symbols=int(n_symbols))


def data_cycle(
    settings: Any,
    sample_rate_hz: Fraction,
    path: str,
    *,
    folder: Path,
    stages: tuple[Any, ...] = (),
    stages_path: str = "stages",
) -> Cycle:
    """Return the shortest loop that also holds whole periods of all data.

    Parameters
    ----------
    settings, sample_rate_hz, path, stages, stages_path
        As in :func:`shortest_cycle`.
    folder : Path
        What the paths of a recipe are relative to.

    Returns
    -------
    Cycle
        ``n_data_periods`` counts those of the first part that has any; 0 if none has.

    Raises
    ------
    RecipeError
        As raised by a source or a stage.
    """
    if stages:
        rate = rates_of(stages, sample_rate_hz)[0]
        inner = data_cycle(settings, rate, path, folder=folder)
        cycle = chain_cycle(inner, stages, sample_rate_hz, stages_path)
        longer = Fraction(cycle.n_samples, inner.n_samples) * rate / sample_rate_hz
        return replace(cycle, n_data_periods=int(inner.n_data_periods * longer))
    if not is_combiner(settings):
        method = getattr(settings, "data_cycle", None)
        found: Cycle | None = method(sample_rate_hz, path, folder) if method else None
        return found or shortest_cycle(settings, sample_rate_hz, path)
    cycles = [
        data_cycle(
            part.signal,
            sample_rate_hz,
            f"{path}.parts[{number}].signal",
            folder=folder,
            stages=part.stages,
            stages_path=f"{path}.parts[{number}].stages",
        )
        for number, part in enumerate(settings.parts)
    ]
    whole = common_cycle([cycle.n_samples for cycle in cycles])
    counted = next((cycle for cycle in cycles if cycle.n_data_periods), cycles[0])
    return replace(
        shortest_cycle(settings, sample_rate_hz, path),
        n_samples=whole,
        n_symbols=0,
        n_data_periods=counted.n_data_periods * whole // counted.n_samples,
    )


def build(signal: Any, stages: tuple[Any, ...], site: Site) -> Built:
    """Build the graph of a recipe.

    Parameters
    ----------
    signal : source or combiner settings
    stages : tuple of stage settings
        Applied in order after the signal.
    site : Site
        At path ``signal`` or ``second_channel.signal``; :func:`check_names` has passed.

    Returns
    -------
    Built

    Raises
    ------
    RecipeError
        As raised by a member.
    """
    parts: list[BuiltPart] = []
    built = _build_signal(signal, source_site(stages, site), parts)
    stages_path = site.path.removesuffix("signal") + "stages"
    return Built(build_chain(stages, site, built, stages_path), parts)


def _build_signal(settings: Any, site: Site, parts: list[BuiltPart]) -> Signal:
    if not is_combiner(settings):
        signal: Signal = settings.build(site)
        return signal
    made: list[Signal] = []
    for number, part in enumerate(settings.parts):
        path = f"{site.path}.parts[{number}]"
        name = part.name or path
        place = len(parts)
        here = site.at(f"{path}.signal", name)
        one = _build_signal(part.signal, source_site(part.stages, here), parts)
        one = build_chain(part.stages, here, one, f"{path}.stages")
        parts.insert(place, BuiltPart(path, name, one))
        made.append(one)
    combined: Signal = settings.combine(site, made)
    return combined


def _named_parts(settings: Any, path: str) -> Iterator[tuple[str, str]]:
    if not is_combiner(settings):
        return
    for number, part in enumerate(settings.parts):
        where = f"{path}.parts[{number}]"
        if part.name:
            yield part.name, f"{where}.name"
        yield from _named_parts(part.signal, f"{where}.signal")


def _shares(value: Any, path: str) -> Iterator[tuple[str, str]]:
    if isinstance(value, tuple):
        for number, item in enumerate(value):
            yield from _shares(item, f"{path}[{number}]")
    elif is_dataclass(value):
        for item in fields(value):
            inner = getattr(value, item.name)
            if item.name == "share" and isinstance(inner, str):
                yield inner, f"{path}.share"
            else:
                yield from _shares(inner, f"{path}.{item.name}")


def _over(
    channels: Mapping[str, Any], walk: Callable[[Any, str], Iterator[tuple[str, str]]]
) -> Iterator[tuple[str, str]]:
    for path, signal in channels.items():
        yield from walk(signal, path)


def check_names(channels: Mapping[str, Any]) -> None:
    """Refuse two parts of one name, and data shared with a part that is not there.

    Parameters
    ----------
    channels : mapping of str to settings
        The signal of each channel by its path. Their parts share one space of names; of several
        channels the path of one that is a plain source is a name too, under which it draws.

    Raises
    ------
    RecipeError
        At the second use of the name, or at ``share``.
    """
    names: dict[str, str] = {}
    if len(channels) > 1:
        names |= {path: path for path, signal in channels.items() if not is_combiner(signal)}
    for name, where in _over(channels, _named_parts):
        if name in names:
            raise RecipeError(
                where=where,
                problem=f"the name {name!r} is taken by {names[name]}",
                allowed="one part a name (a part draws its data by its name)",
                remedy="Rename one of them; to use the same data, write data: {share: ...}.",
            )
        names[name] = where
    for name, where in _over(channels, _shares):
        if name not in names:
            guess = nearest(name, list(names))
            raise RecipeError(
                where=where,
                problem=f"no part is named {name!r}",
                allowed=", ".join(names) or "the name of a part (no part of this recipe has one)",
                remedy=f"Did you mean {guess}?" if guess else "Give the part to share a name.",
            )
