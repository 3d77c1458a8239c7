import numpy as np
import pytest
from scipy.integrate import quad

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.meters.aclr import MeasuredChannel, aclr, aclr_plan, channel_power, passed_below
from wavegen.meters.limits import aclr_row, aclr_row_names
from wavegen.meters.spectrum import spectrum_of

RATE_HZ = 61.44e6
N = 1 << 16


def blocks(*levels):
    """A loop of flat blocks ``(low_hz, high_hz, power)``."""
    frequency = np.fft.fftfreq(N, 1 / RATE_HZ)
    lines = np.zeros(N, complex)
    phases = np.exp(2j * np.pi * np.random.default_rng(1).random(N))
    for low, high, power in levels:
        is_in = (frequency >= low) & (frequency < high)
        lines[is_in] = np.sqrt(power / is_in.sum()) * phases[is_in]
    return (np.fft.ifft(lines) * N).astype(np.complex64)


def spectrum(*levels, **settings):
    return spectrum_of(blocks(*levels), sample_rate_hz=RATE_HZ, **settings)


@pytest.mark.parametrize(("overlap", "error"), [(5 / 6, 3e-4), (15 / 16, 2e-6)])
@pytest.mark.parametrize("below_db", [20.0, 45.0, 80.0])
def test_flat_blocks_give_their_ratio(below_db, overlap, error) -> None:
    """Blocks inside their filters by more than the window's reach.

    Tolerance: at the default overlap samples weigh alike within 1 %, and the power of short
    stretches varies; at 15/16 they weigh alike, and float32 is left.
    """
    leaked = 10 ** (-below_db / 10)
    found = aclr(
        spectrum((-2e6, 2e6, 1.0), (3.5e6, 6.5e6, leaked), overlap=overlap),
        carrier=MeasuredChannel(offset_hz=0.0, bandwidth_hz=4.5e6),
        neighbours=[MeasuredChannel(offset_hz=5e6, bandwidth_hz=4.5e6, limit_db=45.0)],
    )
    assert found.carrier_power == pytest.approx(1.0, rel=error)
    assert found.worst_db == pytest.approx(below_db, abs=10 * error)
    assert found.margin_db == pytest.approx(below_db - 45, abs=10 * error)
    assert found.table().rows[0][3] == f"{found.worst_db:.2f}"
    assert found.rows()[0][0] == "ACLR adjacent, 5 MHz"


def test_a_density_through_the_rrc_filter_is_its_noise_bandwidth() -> None:
    """White density times 3.84 MHz, wherever the bins fall."""
    found = spectrum((-30e6, 30e6, 60e6))
    channel = MeasuredChannel(offset_hz=0.0, bandwidth_hz=3.84e6, filter="rrc")
    for centre in (0.0, 5e6, -7.5123e6):
        power = channel_power(found, channel, centre_hz=centre)
        assert power == pytest.approx(3.84e6, rel=2e-3)


def test_nothing_passes_the_rrc_filter_beyond_its_reach() -> None:
    found = spectrum((-0.5e6, 0.5e6, 1.0), (2.6e6, 3e6, 1.0))
    channel = MeasuredChannel(offset_hz=0.0, bandwidth_hz=3.84e6, filter="rrc")
    assert channel.reach_hz == pytest.approx(2.3424e6)
    assert channel_power(found, channel) == pytest.approx(1.0, rel=3e-4)


def test_integral_of_the_filter() -> None:
    def response(f):
        into = (abs(f) - 0.39) / 0.22
        return 1.0 if into <= 0 else 0.0 if into >= 1 else 0.5 + 0.5 * np.cos(np.pi * into)

    for upper in (-0.7, -0.45, 0.1, 0.39, 0.5, 0.55, 0.61, 2.0):
        want = quad(response, 0, upper, points=[0.39, 0.61], limit=200)[0]
        assert passed_below(np.array(upper), chip_rate_hz=1.0) == pytest.approx(want, abs=1e-7)


def test_channels_must_fit_the_rate() -> None:
    found = spectrum((-2e6, 2e6, 1.0))
    plan = aclr_plan("NR BS FR1", channel_mhz=20)
    assert plan.needed_hz == pytest.approx(2 * (40e6 + 9.54e6))
    with pytest.raises(SignalError) as caught:
        aclr(found, carrier=plan.carrier, neighbours=plan.neighbours)
    assert "99.08 MHz" in caught.value.remedy
    with pytest.raises(SignalError):
        aclr(found, carrier=plan.carrier, neighbours=plan.neighbours[:1], centre_hz=-15e6)


def test_a_carrier_without_power_is_refused() -> None:
    found = spectrum((-2e6, 2e6, 1.0))
    object.__setattr__(found, "density", np.zeros_like(found.density))
    with pytest.raises(SignalError):
        aclr(found, carrier=MeasuredChannel(offset_hz=0.0, bandwidth_hz=1e6), neighbours=[])


@pytest.mark.parametrize("name", aclr_row_names())
def test_every_row_makes_channels_that_do_not_overlap(name) -> None:
    for width in aclr_row(name)[1]["carrier_bandwidth_mhz"]:
        plan = aclr_plan(name, channel_mhz=float(width))
        assert len({channel.offset_hz for channel in plan.neighbours}) == len(plan.neighbours)
        for channel in plan.neighbours:
            assert abs(channel.offset_hz) >= plan.carrier.bandwidth_hz / 2
            assert channel.limit_db
        assert plan.source
        assert plan.status


def test_offsets_of_neighbours_of_another_system() -> None:
    plan = aclr_plan("nr ue fr1 to utra", channel_mhz=20)
    assert [channel.offset_hz / 1e6 for channel in plan.neighbours] == [-12.5, 12.5, -17.5, 17.5]
    assert {channel.filter for channel in plan.neighbours} == {"rrc"}
    assert plan.carrier.bandwidth_hz == 19.095e6


@pytest.mark.parametrize(("name", "width"), [("NR BS FR1", 17), ("NR BX FR1", 20)])
def test_unknown_rows_and_widths(name, width) -> None:
    with pytest.raises(ArgumentsError):
        aclr_plan(name, channel_mhz=width)
