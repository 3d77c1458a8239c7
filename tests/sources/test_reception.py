import pytest

from wavegen.core.signal import Signal
from wavegen.sources.ofdm_signal import Prefixed
from wavegen.sources.reception import Receivable, SymbolClass
from wavegen.sources.single_carrier import ShapedCarrier


@pytest.mark.parametrize("kind", [ShapedCarrier, Prefixed])
def test_sources_with_symbols_can_be_received(kind) -> None:
    assert issubclass(kind, Receivable)


def test_others_cannot() -> None:
    assert not issubclass(Signal, Receivable)


def test_pilots_carry_no_data() -> None:
    assert SymbolClass(name="groups[0]", constellation="qpsk").is_data
    assert not SymbolClass(name="pilots[0]").is_data
