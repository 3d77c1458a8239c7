from pathlib import Path

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.core.render import samples_of
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import NoLaw
from wavegen.stages.chain import chain_law
from wavegen.stages.device.memory_polynomial import MemoryPolynomial

PATH = Path(__file__).with_name("data") / "aligned.csv"


def test_coefficients_come_from_the_file(bench):
    site = bench.site(2000)
    signal = MemoryPolynomial(path=str(PATH), input_back_off_db=14.0).build(
        site, bench.gaussian(2000)
    )
    assert len(signal.coefficients.terms) == 6
    assert np.isfinite(samples_of(signal)).all()
    assert signal.drive == pytest.approx(
        signal.coefficients.largest_amplitude * 10**-0.7, rel=0.1
    )  # the loop's own mean is 1 within its scatter


def test_memory_leaves_no_law(bench):
    settings = MemoryPolynomial(path=str(PATH), input_back_off_db=14.0)
    found = chain_law((settings,), bench.site(10), GaussianLaw(), "stages")
    assert isinstance(found, NoLaw)
    assert "memory polynomial" in found.reason


def test_no_file(bench):
    with pytest.raises(FileError):
        MemoryPolynomial(path="none.csv", input_back_off_db=14.0).build(
            bench.site(10), bench.gaussian(10)
        )
