from fractions import Fraction

import pytest

from wavegen.core.site import Site
from wavegen.meters.aclr import AclrPlan, MeasuredChannel
from wavegen.meters.evm_probe import EvmSettings
from wavegen.meters.fidelity import BeforeAfter, FidelitySettings, measure_fidelity
from wavegen.meters.mask import MaskPoint, SpectralMask
from wavegen.meters.spectrum import SpectrumMeter
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.stages.crest.clip import Clip

RATE_HZ = Fraction(8_000_000)
SETTINGS = FidelitySettings(
    spectrum=SpectrumMeter(n_fft=1024),
    evm=EvmSettings(has_spread=True),
    channels=AclrPlan(
        name="own",
        carrier=MeasuredChannel(offset_hz=0.0, bandwidth_hz=1e6, filter="rrc"),
        neighbours=tuple(
            MeasuredChannel(offset_hz=side * 1.5e6, bandwidth_hz=1e6, filter="rrc", limit_db=40.0)
            for side in (-1, 1)
        ),
        source="own",
        status="own",
    ),
    mask=SpectralMask(
        points=(MaskPoint(offset_hz=1e6, level_db=-40), MaskPoint(offset_hz=3e6, level_db=-60)),
        measurement_bandwidth_hz=1e5,
    ),
)


@pytest.fixture(scope="module")
def pair():
    site = Site(sample_rate_hz=RATE_HZ, n_samples=32_000, seed=1, label="x", path="signal")
    settings = SingleCarrier(
        constellation=Constellation.parse("16qam"), symbol_rate_hz=Fraction(1_000_000)
    )
    carrier = settings.build(site)
    return carrier, Clip(ceiling_db=3.0).build(site, carrier)


def test_before_and_after(pair) -> None:
    carrier, clipped = pair
    before = measure_fidelity(carrier, settings=SETTINGS)
    after = measure_fidelity(clipped, settings=SETTINGS, reference=carrier)
    assert before.evm[0].percent < 0.01
    assert before.aclr.worst_db > 90
    assert before.mask.is_kept
    assert after.evm[0].percent > 1
    assert after.aclr.worst_db < before.aclr.worst_db - 30
    assert after.cubic.raw_db < before.cubic.raw_db
    assert after.total.fitted_percent > after.evm[0].percent  # out-of-band error counts too
    # the mean was restored, so that the gain fell below 1 and the fit divides by it
    assert after.total.unfitted_percent < after.total.fitted_percent
    assert before.occupied.width_hz == pytest.approx(1.1e6, rel=0.05)
    rows = {row[0]: row[1:] for row in BeforeAfter(before=before, after=after).table().rows}
    assert rows["EVM signal"] == (
        f"{before.evm[0].percent:.3f} %",
        f"{after.evm[0].percent:.3f} %",
    )
    assert rows["total error, gain-fitted"][0] == ""
    assert {"raw cubic metric", "mask margin", "occupied bandwidth (99 %)"} <= set(rows)
    assert len(after.table().rows) == len(rows)


def test_strips_and_workers_change_nothing(pair) -> None:
    carrier, clipped = pair
    one = measure_fidelity(clipped, settings=SETTINGS, reference=carrier)
    two = measure_fidelity(
        clipped, settings=SETTINGS, reference=carrier, strip_samples=7_001, workers=2
    )
    assert one.rows() == two.rows()
    assert one.aclr == two.aclr
    assert one.evm == two.evm


def test_only_what_is_asked() -> None:
    site = Site(sample_rate_hz=RATE_HZ, n_samples=8_000, seed=1, label="x", path="signal")
    settings = SingleCarrier(
        constellation=Constellation.parse("qpsk"), symbol_rate_hz=Fraction(1_000_000)
    )
    found = measure_fidelity(settings.build(site), settings=FidelitySettings(evm=None))
    assert found.evm == ()
    assert found.aclr is None
    assert found.mask is None
    assert found.total is None
