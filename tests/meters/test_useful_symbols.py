from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.excerpt import excerpt
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.meters.useful_symbols import UsefulSymbols, symbols_of
from wavegen.sources.carrier import Carrier
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.ofdm_parts import Group
from wavegen.sources.subcarriers import IndexSet

N_FFT, N_SYMBOLS = 64, 12
LENGTH = 4 * (N_FFT + 9) + 8 * (N_FFT + 5)


def site(n_samples=LENGTH):
    return Site(
        sample_rate_hz=Fraction(64 * 15000), n_samples=n_samples, seed=1, label="a", path="signal"
    )


@pytest.fixture(scope="module")
def source():
    group = Group(
        subcarriers=IndexSet.parse("-20..-1, 1..20"), constellation=Constellation.parse("16qam")
    )
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(group,),
        cyclic_prefix=CyclicPrefix.parse(["9 samples", "2 x 5 samples"]),
        edge_window=Stretch.parse("3 samples"),
    )
    return settings.build(site())


def test_useful_parts_are_the_bodies(source):
    # The edge window lies in the prefixes: what is useful is as it was before them.
    useful = UsefulSymbols.of(source, source)
    bodies = source.inputs[0]
    assert useful.n_samples == bodies.n_samples == N_SYMBOLS * N_FFT
    np.testing.assert_allclose(samples_of(useful), samples_of(bodies), atol=2e-6)


def test_bits_do_not_depend_on_the_cut(source):
    useful = UsefulSymbols.of(source, source)
    whole = samples_of(useful)
    for start, stop in ((0, 64), (100, 300), (700, 768), (64, 65)):
        np.testing.assert_array_equal(evaluate({useful: (start, stop)})[useful], whole[start:stop])


def test_symbols_are_looked_for_behind_a_chain(source):
    assert symbols_of(source) is source
    assert symbols_of(excerpt(source, 0, 100)) is source
    assert symbols_of(Carrier().build(site(100))) is None
