"""Picture of constellations."""

import numpy as np

from wavegen.reports.figures.modulation import Cloud, constellation_figure


def test_each_class_has_its_panel_with_its_evm_three_at_most():
    ideal = np.array([1, 1j, -1, -1j], np.complex64)
    clouds = [
        Cloud(name=f"group {k}", received=ideal * 1.1, ideal=ideal, evm_percent=10.0)
        for k in range(4)
    ]
    figure = constellation_figure(clouds, title="T")
    assert [axes.get_title() for axes in figure.axes] == [f"group {k}: EVM 10 %" for k in range(3)]
    for axes in figure.axes:
        assert axes.get_aspect() == 1
        low, high = axes.get_xlim()
        assert low < -1.1
        assert high > 1.1
