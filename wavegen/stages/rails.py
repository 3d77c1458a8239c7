"""What becomes of a law behind stages that treat the rails of a sample apart."""

from __future__ import annotations

from typing import ClassVar, Protocol, runtime_checkable

from wavegen.core.site import Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.inversion import law_of_term
from wavegen.laws.law import Law
from wavegen.laws.term import GaussianTerm, NoLaw, Term


@runtime_checkable
class TreatsRailsApart(Protocol):
    """A stage for which the law of the envelope is not enough: it asks for directions too."""

    treats_rails_apart: ClassVar[bool]

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the term of the output for that of the input; none by name."""


def rails_law(stage: TreatsRailsApart, site: Site, source: Law, what: str) -> Law | NoLaw:
    """Return the law behind a stage where that of the envelope is all that is known.

    Parameters
    ----------
    stage : TreatsRailsApart
        The stage.
    site : Site
        Of its output.
    source : Law
        Of its input.
    what : str
        What it does, in words: ``with its image``.

    Returns
    -------
    Law or NoLaw
        Of complex Gaussian noise, which alone is isotropic by its law.
    """
    if not isinstance(source, GaussianLaw):
        return NoLaw(reason=f"{source.name}, {what}, has no law")
    made = stage.term(site, GaussianTerm(name=source.name, holds=source.holds))
    return made if isinstance(made, NoLaw) else law_of_term(made)
