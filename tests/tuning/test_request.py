from wavegen.tuning.limits import Limits
from wavegen.tuning.request import TuneRequest


def test_defaults():
    request = TuneRequest(limits=Limits(evm_percent=8.0))
    assert (request.probability, request.methods, request.seconds) == (1e-4, (), 60.0)
    assert request.device is None
