import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.limits import (
    aclr_row,
    aclr_row_names,
    evm_limit,
    evm_limit_names,
    evm_limit_of,
    evm_window_samples,
)


@pytest.mark.parametrize("name", evm_limit_names())
def test_every_limit_is_found_by_its_name(name) -> None:
    limit = evm_limit(name)
    assert limit.name == name
    assert 0 < limit.percent < 60
    assert limit.source
    assert limit.status


@pytest.mark.parametrize("name", aclr_row_names())
def test_every_row_has_source_and_status(name) -> None:
    known, row = aclr_row(name.upper())
    assert known == name
    assert row["source"]
    assert row["status"]


def test_limits_of_the_programs_constellations() -> None:
    assert evm_limit_of("NR BS FR1", "64qam").percent == 8
    assert evm_limit_of("E-UTRA UE", "bpsk").percent == 17.5
    assert evm_limit_of("edge ms", "8psk").percent == 9
    assert evm_limit_of("NR BS FR1", "1024qam") is None  # two limits, by frequency
    assert evm_limit_of("NR BS FR1", "8psk") is None
    with pytest.raises(ArgumentsError):
        evm_limit_of("NR BS", "64qam")


def test_a_misspelt_name_is_guessed() -> None:
    with pytest.raises(ArgumentsError) as caught:
        evm_limit("NR BS FR1 64QAN")
    assert "NR BS FR1 64QAM" in caught.value.remedy
    with pytest.raises(ArgumentsError):
        aclr_row("5G")


def test_windows_keep_their_duration() -> None:
    known = {"frequency_range": "FR1", "spacing_khz": 15, "channel_mhz": 20}
    assert evm_window_samples(**known, n_fft=2048) == 58
    assert evm_window_samples(**known, n_fft=1024) == 28
    with pytest.raises(ArgumentsError):
        evm_window_samples(frequency_range="FR1", spacing_khz=15, channel_mhz=100, n_fft=2048)
