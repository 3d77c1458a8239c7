import json

import numpy as np
import pytest

from wavegen.comparison.device_gain import device_gain
from wavegen.comparison.gain_document import gain_document


def test_what_is_not_finite_is_null(side, noise, rapp):
    """A saturated device: the 1 dB point lies under the first level."""
    samples = noise(1 << 15) * 3
    found = device_gain((side(samples), side(rapp(samples))), None, tolerance_db=0.2, down_to=1e-3)
    document = gain_document(found, model=None)
    json.dumps(document, allow_nan=False)
    assert document["compression"][0]["low"] is None
    assert document["verdict"] == "differ"


def test_errors_of_the_reference_count_where_the_gain_is_relative(side, noise):
    first, second = (noise(1 << 15) for _ in range(2))
    sides = side(first, loops=False), side(second, loops=False)
    found = device_gain(sides, None, tolerance_db=0.2, down_to=0.01)
    rows = gain_document(found, model=None)["gain"]
    width = np.array([row["high_db"] - row["low_db"] for row in rows])
    plain = found.points.high_db - found.points.low_db
    assert (width > plain).all()
    assert width[0] == pytest.approx(2 * np.hypot(plain[0] / 2, found.small.error_db), rel=0.1)
