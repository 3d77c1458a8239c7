"""Limits: numbers, standards, a reserve, and by how much they are kept."""

import math

import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.limits import UNLIMITED_DB, Limits, read_evm_limit


def test_each_margin_is_in_db(made):
    limits = Limits(evm_percent=8.0, aclr_db=45.0, keeps_mask=True)
    margins = limits.margins(made.evaluation(percent=4.0, ratio_db=47.0, mask_margin_db=3.0))
    assert margins.evm_db == pytest.approx(20 * math.log10(2))
    assert margins.aclr_db == pytest.approx(2.0)
    assert margins.mask_db == 3.0
    assert (margins.least_db, margins.binding) == (pytest.approx(2.0), "ACLR")


def test_the_reserve_is_taken_off_by_root_sum_square(made):
    limits = Limits(evm_percent=8.0, reserve_percent=4.8)
    assert limits.margins(made.evaluation(percent=6.4)).evm_db == pytest.approx(0.0, abs=1e-9)


def test_a_standard_has_a_limit_for_each_constellation(made):
    groups = (
        made.entry(6.0),
        made.entry(5.0, name="groups[0]", constellation="64qam"),
        made.entry(7.0, name="groups[1]", constellation="qpsk"),
        made.entry(9.0, name="pilots[0]", constellation=""),
    )
    limits = read_evm_limit("nr bs fr1")
    found = limits.margins(made.evaluation(evm=groups))
    assert found.evm_db == pytest.approx(20 * math.log10(8 / 5))
    with pytest.raises(ArgumentsError):
        limits.margins(made.evaluation(evm=(made.entry(5.0, name="x", constellation="8psk"),)))


def test_one_row_of_a_standard_is_a_number():
    assert read_evm_limit("NR BS FR1 64QAM") == Limits(evm_percent=8.0)
    with pytest.raises(ArgumentsError):
        read_evm_limit("NR BS FR9")


def test_channels_with_limits_of_their_own(made):
    limits = Limits(keeps_channel_limits=True)
    assert limits.margins(made.evaluation(ratio_db=44.0)).aclr_db == -1.0


def test_the_worst_source_counts(made):
    two = (made.entry(2.0), made.entry(8.0, source="parts[1]"))
    assert Limits(evm_percent=8.0).margins(made.evaluation(evm=two)).evm_db == 0.0


def test_margins_end_somewhere(made):
    assert Limits(evm_percent=8.0).margin_db(made.evaluation(percent=0.0)) == UNLIMITED_DB
    failed = Evaluation(method="clip", text="x", settings={}, fault="no")
    assert Limits(evm_percent=8.0).margin_db(failed) == -math.inf


@pytest.mark.parametrize(
    "given",
    [{}, {"reserve_percent": 2.0, "aclr_db": 45.0}, {"evm_percent": 8.0, "reserve_percent": 8.0}],
)
def test_what_is_refused(given):
    with pytest.raises(ArgumentsError):
        Limits(**given)


def test_words():
    limits = Limits(evm_percent=8.0, reserve_percent=2.0, aclr_db=45.0)
    assert limits.words() == "EVM up to 8 %, less 2 % for the rest of the chain, ACLR from 45 dB"
