"""Quadrature in panels: Gauss-Legendre between the points where a curve is not smooth."""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

NODES = 16
"""Nodes in a panel: polynomials up to degree 31 are integrated exactly."""


@lru_cache(maxsize=1)
def _rule() -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return nodes and weights on -1 ... 1, and the matrix that differentiates at the nodes."""
    nodes, weights = legendre.leggauss(NODES)
    values = legendre.legvander(nodes, NODES - 1)
    slopes = np.stack(
        [legendre.legval(nodes, legendre.legder(row)) for row in np.eye(NODES)], axis=1
    )
    return nodes, weights, slopes @ np.linalg.inv(values)


def panel_edges(
    low: float, high: float, *, n_panels: int, kinks: Iterable[float] = ()
) -> NDArray[np.float64]:
    """Return the ends of even panels, cut again at the kinks that lie inside.

    Parameters
    ----------
    low, high : float
        Ends of the range, ``low < high``.
    n_panels : int
        Even panels.
    kinks : iterable of float
        Where a curve is not smooth.

    Returns
    -------
    float64 array, shape (n_edges,)
        Rising.
    """
    inside = [kink for kink in kinks if low < kink < high]
    return np.unique(np.concatenate((np.linspace(low, high, n_panels + 1), inside)))


def nodes_of(edges: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return nodes and weights of a rule in panels.

    Parameters
    ----------
    edges : float64 array, shape (n_panels + 1,)
        Rising.

    Returns
    -------
    nodes, weights : float64 array, shape (n_panels, NODES)

    Examples
    --------
    >>> nodes, weights = nodes_of(np.linspace(0, 2, 4))
    >>> round(float(np.sum(weights * nodes**3)), 12)
    4.0
    """
    nodes, weights, _ = _rule()
    half = np.diff(edges)[:, None] / 2
    middle = (edges[1:] + edges[:-1])[:, None] / 2
    return middle + half * nodes, half * weights


def slopes_at_nodes(values: NDArray[np.float64], edges: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the derivative of a function known at the nodes, smooth inside each panel.

    Parameters
    ----------
    values : float64 array, shape (n_panels, NODES)
        The function at :func:`nodes_of`.
    edges : float64 array, shape (n_panels + 1,)
        The panels.

    Returns
    -------
    float64 array, shape (n_panels, NODES)
    """
    _, _, differentiate = _rule()
    return np.asarray((values @ differentiate.T) / (np.diff(edges)[:, None] / 2))
