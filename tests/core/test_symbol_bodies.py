from fractions import Fraction

from wavegen.core.signal import Signal
from wavegen.core.symbol_bodies import HasBodies


class Bare(Signal):
    pass


class WithBodies(Signal):
    bodies = grid = None
    undone_by = ()

    def with_bodies(self, bodies, *, undo=None):
        return self


def test_a_signal_is_told_by_what_it_has():
    assert not isinstance(Bare(sample_rate_hz=Fraction(1), n_samples=1), HasBodies)
    assert isinstance(WithBodies(sample_rate_hz=Fraction(1), n_samples=1), HasBodies)
