"""The law of a recipe: sources state theirs, stages and sums say what becomes of it."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import Any

from wavegen.core.site import Site
from wavegen.laws.inversion import law_of_term
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.production.graph import is_combiner
from wavegen.stages.chain import HasLaw, HasTerm, rates_of, source_site


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
    law = _law_of(settings, source_site(stages, site))
    rates = rates_of(stages, site.sample_rate_hz)
    for number, stage in enumerate(stages):
        if isinstance(law, NoLaw):
            return law
        if not isinstance(stage, HasLaw):
            return NoLaw(reason=f"{_name(stage)} has no law")
        law = stage.law(_site_at(site, rates[number + 1], f"stages[{number}]"), law)
    return law


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
        found = _term_of(part.signal, source_site(part.stages, here))
        rates = rates_of(part.stages, site.sample_rate_hz)
        for index, stage in enumerate(part.stages):
            if isinstance(found, NoLaw):
                break
            if isinstance(stage, HasTerm):
                found = stage.term(
                    _site_at(here, rates[index + 1], f"{path}.stages[{index}]"), found
                )
            else:
                found = NoLaw(reason=f"{_name(stage)} in a sum has no law")
        if isinstance(found, NoLaw):
            return found
        terms.append(found)
    combined: Term | NoLaw = settings.term(site, terms)
    return combined


def _site_at(site: Site, rate: Any, path: str) -> Site:
    """Return the site of a stage: its own rate, a loop of the same duration."""
    n_samples = site.n_samples * rate / site.sample_rate_hz
    return replace(site, sample_rate_hz=rate, n_samples=int(n_samples), path=path)


def _name(settings: Any) -> str:
    """Return a class's name as words: ``single carrier``."""
    return re.sub(r"(?<=[a-z])(?=[A-Z])", " ", type(settings).__name__).lower()
