"""Stages from signal to signal: one file each, one line here."""

from wavegen.core.registry import Registry

STAGES = Registry(
    "stage",
    {
        "clip": "wavegen.stages.crest.clip:Clip",
        "clip_filter": "wavegen.stages.crest.clip_filter:ClipFilter",
        "clock_jitter": "wavegen.stages.converter.clock_jitter:ClockJitter",
        "constellation_extension": (
            "wavegen.stages.crest.constellation_extension:ConstellationExtension"
        ),
        "dc_offset": "wavegen.stages.converter.dc_offset:DcOffset",
        "delay": "wavegen.stages.channel.delay:Delay",
        "filter": "wavegen.stages.channel.filter:Filter",
        "gate": "wavegen.stages.channel.gate:Gate",
        "generalised_memory_polynomial": (
            "wavegen.stages.device.generalised_memory_polynomial:GeneralisedMemoryPolynomial"
        ),
        "ghorbani": "wavegen.stages.device.ghorbani:Ghorbani",
        "hold_droop": "wavegen.stages.converter.hold_droop:HoldDroop",
        "iq_imbalance": "wavegen.stages.converter.iq_imbalance:IqImbalance",
        "measured_amplifier": "wavegen.stages.device.measured_amplifier:MeasuredAmplifier",
        "memory_polynomial": "wavegen.stages.device.memory_polynomial:MemoryPolynomial",
        "modified_rapp": "wavegen.stages.device.modified_rapp:ModifiedRapp",
        "path_response": "wavegen.stages.converter.path_response:PathResponse",
        "peak_cancellation": "wavegen.stages.crest.peak_cancellation:PeakCancellation",
        "peak_windowing": "wavegen.stages.crest.peak_windowing:PeakWindowing",
        "phase_noise": "wavegen.stages.converter.phase_noise:PhaseNoise",
        "projection": "wavegen.stages.crest.projection:Projection",
        "quantise": "wavegen.stages.converter.quantise:Quantise",
        "rapp": "wavegen.stages.device.rapp:Rapp",
        "resample": "wavegen.stages.channel.resample:Resample",
        "saleh": "wavegen.stages.device.saleh:Saleh",
        "scale": "wavegen.stages.channel.scale:Scale",
        "selected_mapping": "wavegen.stages.crest.selected_mapping:SelectedMapping",
        "tone_reservation": "wavegen.stages.crest.tone_reservation:ToneReservation",
    },
)

COMBINERS = Registry("combiner", {"sum": "wavegen.stages.combine.sum:Sum"})
