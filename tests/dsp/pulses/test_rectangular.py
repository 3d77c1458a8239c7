from fractions import Fraction

import numpy as np

from wavegen.dsp.pulses.rectangular import Rectangular


def test_held_from_its_instant_until_the_next():
    pulse = Rectangular().design(Fraction(7, 3))
    assert pulse.values(np.array([-0.01, 0.0, 0.5, 0.999, 1.0])).tolist() == [0, 1, 1, 1, 0]
    assert pulse.on_lattice(3).tolist() == [0, 0, 0, 1, 1, 1]
