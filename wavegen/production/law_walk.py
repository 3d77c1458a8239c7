"""The law of a recipe: sources state theirs, stages and sums say what becomes of it."""

from __future__ import annotations

import re
from typing import Any

from wavegen.core.site import Site
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.inversion import law_of_term
from wavegen.laws.law import Law
from wavegen.laws.radial import RadialLaw
from wavegen.laws.tabulated import tabulated
from wavegen.laws.term import NoLaw, Term
from wavegen.production.chain_cut import Passing
from wavegen.production.graph import is_combiner
from wavegen.stages.chain import HasLaw, chain_law, chain_term, source_site
from wavegen.stages.rails import TreatsRailsApart


def law_of_recipe(settings: Any, stages: tuple[Any, ...], site: Site) -> Law | NoLaw:
    """Return the law of a signal behind its stages, without a sample.

    Parameters
    ----------
    settings : source or combiner settings
    stages : tuple of stage settings
        In the order of the signal.
    site : Site
        As in ``build``: of the loop at the end of the stages.

    Returns
    -------
    Law or NoLaw
        What has no law says so by name.
    """
    here = source_site(stages, site)
    mute = next((stage for stage in stages if not isinstance(stage, HasLaw)), None)
    if mute is not None and is_combiner(settings):  # the law of a sum would be computed in vain
        term = _term_of(settings, here)
        named = term if isinstance(term, NoLaw) else ConstantLaw(name=term.name)
        return chain_law((mute,), site, named, "stages")
    apart = [isinstance(stage, TreatsRailsApart) for stage in stages]
    if any(apart):
        n_before = len(apart) - apart[::-1].index(True)
        found = _law_by_term(settings, stages, n_before, site)
        if found is not None:
            return found
    law = _law_of(settings, here)
    return chain_law(stages, site, _looked_up(law), "stages")


def _looked_up(law: Law | NoLaw) -> Law | NoLaw:
    """Return a law that is slow at one level on a table."""
    return tabulated(law) if isinstance(law, RadialLaw) else law


def _law_by_term(
    settings: Any, stages: tuple[Any, ...], n_before: int, site: Site
) -> Law | NoLaw | None:
    """Return the law of stages of which the first ones ask for directions too, None if unknown."""
    term = _term_of(settings, source_site(stages, site))
    if not isinstance(term, NoLaw) and is_combiner(settings) and term.symmetry:
        return None  # which way it is turned at an index is not told
    between = source_site(stages[n_before:], site)
    behind = chain_term(stages[:n_before], between, term, "stages")
    law = behind if isinstance(behind, NoLaw) else law_of_term(behind)
    if isinstance(law, NoLaw):
        return None
    later = (*[Passing()] * n_before, *stages[n_before:])
    return chain_law(later, site, _looked_up(law), "stages")


def _law_of(settings: Any, site: Site) -> Law | NoLaw:
    if is_combiner(settings):
        term = _term_of(settings, site)
        return term if isinstance(term, NoLaw) else law_of_term(term)
    method = getattr(settings, "law", None)
    law: Law | NoLaw | None = method(site) if method else None
    return NoLaw(reason=f"{_name(settings)} has no law") if law is None else law


def _term_of(settings: Any, site: Site) -> Term | NoLaw:
    """Return a part of a composite as its law sees it."""
    if not is_combiner(settings):
        method = getattr(settings, "term", None)
        term: Term | NoLaw | None = method(site) if method else None
        return NoLaw(reason=f"{_name(settings)} in a sum has no law") if term is None else term
    terms: list[Term] = []
    for number, part in enumerate(settings.parts):
        path = f"{site.path}.parts[{number}]"
        here = site.at(f"{path}.signal", part.name or path)
        source = _term_of(part.signal, source_site(part.stages, here))
        found = chain_term(part.stages, here, source, f"{path}.stages")
        if isinstance(found, NoLaw):
            return found
        terms.append(found)
    combined: Term | NoLaw = settings.term(site, terms)
    return combined


def _name(settings: Any) -> str:
    """Return a class's name as words: ``single carrier``."""
    return re.sub(r"(?<=[a-z])(?=[A-Z])", " ", type(settings).__name__).lower()
