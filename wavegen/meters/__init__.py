"""Meters: one file each, one line here."""

from wavegen.core.registry import Registry

METERS = Registry(
    "meter",
    {
        "power": "wavegen.meters.power:PowerMeter",
        "gated_power": "wavegen.meters.gated:GatedPowerMeter",
        "batched_power": "wavegen.meters.batches:BatchedPowerMeter",
        "mean": "wavegen.meters.mean:MeanMeter",
        "opening": "wavegen.meters.opening:OpeningMeter",
        "burst_powers": "wavegen.meters.burst_powers:BurstPowerMeter",
        "record": "wavegen.meters.record:RecordMeter",
        "envelope": "wavegen.meters.envelope:EnvelopeMeter",
        "spectrum": "wavegen.meters.spectrum:SpectrumMeter",
        "cubic": "wavegen.meters.cubic:CubicMeter",
        "evm": "wavegen.meters.evm:EvmMeter",
        "frame_error": "wavegen.meters.evm_errors:FrameErrorMeter",
        "symbol_papr": "wavegen.meters.symbol_papr:SymbolPaprMeter",
    },
)
