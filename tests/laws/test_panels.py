import numpy as np
import pytest

from wavegen.laws.panels import nodes_of, panel_edges, slopes_at_nodes


def test_kinks_become_edges_if_they_lie_inside():
    edges = panel_edges(0.0, 4.0, n_panels=4, kinks=(2.5, 9.0, -1.0, 3.0))
    assert edges.tolist() == [0, 1, 2, 2.5, 3, 4]


def test_a_kink_costs_no_accuracy():
    edges = panel_edges(0.0, 3.0, n_panels=5, kinks=(1.234,))
    nodes, weights = nodes_of(edges)
    want = 1.234**2 / 2 + 1.234 * (3 - 1.234)
    assert np.sum(weights * np.minimum(nodes, 1.234)) == pytest.approx(want, rel=1e-14)


def test_slopes_of_a_polynomial_are_exact():
    edges = panel_edges(-1.0, 2.0, n_panels=3)
    nodes, _ = nodes_of(edges)
    assert slopes_at_nodes(nodes**7, edges) == pytest.approx(7 * nodes**6, abs=1e-10)
