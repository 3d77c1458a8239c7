"""At least one example of every source, stage and combiner: a member without one fails."""

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.dsp.pulses.half_sine import HalfSine
from wavegen.dsp.pulses.linearised_gaussian import LinearisedGaussian
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.sources.carrier import Carrier
from wavegen.sources.data.pattern import BitText, Pattern
from wavegen.sources.data.prbs import PseudoRandom
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.noise import Noise
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.phase_modulation import PhaseModulation
from wavegen.sources.recording import Recording
from wavegen.sources.rotation import Rotation
from wavegen.sources.shaped import LevelPoint, Shaped
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet
from wavegen.sources.tones import Notch, Tone, Tones
from wavegen.stages.channel.delay import Delay
from wavegen.stages.channel.filter import Filter, FilterTaps
from wavegen.stages.channel.gate import Gate
from wavegen.stages.channel.resample import Resample
from wavegen.stages.channel.scale import Scale
from wavegen.stages.combine.sum import Part, Sum
from wavegen.stages.converter.clock_jitter import ClockJitter
from wavegen.stages.converter.dc_offset import DcOffset
from wavegen.stages.converter.hold_droop import HoldDroop
from wavegen.stages.converter.iq_imbalance import IqImbalance
from wavegen.stages.converter.path_response import PathResponse
from wavegen.stages.converter.phase_noise import PhaseMask, PhaseNoise
from wavegen.stages.converter.quantise import Quantise
from wavegen.stages.crest.clip import Clip
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.crest.constellation_extension import ConstellationExtension
from wavegen.stages.crest.peak_cancellation import PeakCancellation
from wavegen.stages.crest.peak_windowing import PeakWindowing
from wavegen.stages.crest.projection import Projection
from wavegen.stages.crest.selected_mapping import SelectedMapping
from wavegen.stages.crest.tone_reservation import ToneReservation
from wavegen.stages.device.generalised_memory_polynomial import GeneralisedMemoryPolynomial
from wavegen.stages.device.ghorbani import Ghorbani
from wavegen.stages.device.measured_amplifier import MeasuredAmplifier
from wavegen.stages.device.memory_polynomial import MemoryPolynomial
from wavegen.stages.device.modified_rapp import ModifiedRapp
from wavegen.stages.device.rapp import Rapp
from wavegen.stages.device.saleh import Saleh
from wavegen.stages.passband import Passband

RATE_HZ = Fraction(1_000_000)
LOOP_SAMPLES = 40_000
"""About as long as each loop is made: whole cycles, several cells of any grid."""


@dataclass(frozen=True, kw_only=True)
class SourceExample:
    """Settings of a source, and what is known of it beforehand.

    Parameters
    ----------
    settings : member of SOURCES
    is_random : bool
        Whether another seed or label gives other samples.
    is_exact : bool
        Whether every loop has unit mean power, rather than the average over seeds.
    least_samples : int
        Loop to make, at least.
    """

    settings: Any
    is_random: bool = True
    is_exact: bool = False
    least_samples: int = LOOP_SAMPLES


SOURCE_EXAMPLES: dict[str, tuple[SourceExample, ...]] = {
    "carrier": (
        SourceExample(settings=Carrier(phase_deg=30.0), is_random=False, is_exact=True),
        SourceExample(settings=Carrier(), is_random=False, is_exact=True, least_samples=1),
    ),
    "noise": (
        SourceExample(settings=Noise(bandwidth_hz=Fraction(1_000_000))),
        SourceExample(settings=Noise(bandwidth_hz=Fraction(300_000))),
        SourceExample(settings=Noise(bandwidth_hz=Fraction(300_000)), least_samples=97),
    ),
    "recording": (
        SourceExample(
            settings=Recording(
                path=str(Path(__file__).with_name("data") / "invented-field.ci8"),
                format="ci8",
                sample_rate_hz=RATE_HZ,
            ),
            is_random=False,
            is_exact=True,
            least_samples=5_000,
        ),
    ),
    "shaped": (
        SourceExample(
            settings=Shaped(
                points=(
                    LevelPoint(probability_percent=60, level_db=-1.0),
                    LevelPoint(probability_percent=1, level_db=5.9),
                    LevelPoint(probability_percent=0.1, level_db=7.2),
                ),
                bandwidth_hz=Fraction(300_000),
            ),
            least_samples=97,
        ),
    ),
    "ofdm": (
        SourceExample(
            settings=Ofdm(
                subcarrier_spacing_hz=Fraction(15_625),
                groups=(
                    Group(
                        subcarriers=IndexSet.parse("-20..-1, 1..20"),
                        constellation=Constellation.parse("16qam"),
                    ),
                ),
                cyclic_prefix=CyclicPrefix.parse(["6 samples", "2 x 5 samples"]),
                edge_window=Stretch.parse("3 samples"),
            )
        ),
        SourceExample(
            settings=Ofdm(
                subcarrier_spacing_hz=Fraction(15_625),
                groups=(
                    Group(
                        subcarriers=IndexSet.parse("-20..-1, 2..20"),
                        constellation=Constellation.parse("qpsk"),
                        level_db=-3.0,
                    ),
                ),
                pilots=(
                    Pilots(subcarriers=IndexSet.parse("1, 21"), values=PilotValues.parse([1, -1])),
                ),
                cyclic_prefix=CyclicPrefix.parse("1/4"),
            )
        ),
        SourceExample(
            settings=Ofdm(
                subcarrier_spacing_hz=Fraction(15_625),
                groups=(
                    Group(
                        subcarriers=IndexSet.parse("-18..17"),
                        constellation=Constellation.parse("16qam"),
                        symbols=SymbolSet.parse("0, 2"),
                        spreading="dft",
                    ),
                    Group(
                        subcarriers=IndexSet.parse("-12..-1"),
                        constellation=Constellation.parse("bpsk"),
                        symbols=SymbolSet.parse("1"),
                        spreading="dft",
                        rotation=Rotation.parse("pi/2"),
                    ),
                ),
                pilots=(
                    Pilots(
                        subcarriers=IndexSet.parse("0..15 by 3"),
                        values=PilotValues.parse({"random": "qpsk"}),
                        symbols=SymbolSet.parse("1"),
                    ),
                ),
                cyclic_prefix=CyclicPrefix.parse(["6 samples", "2 x 5 samples"]),
                edge_window=Stretch.parse("3 samples"),
                frame_symbols=4,
                half_subcarrier_shift=True,
            )
        ),
    ),
    "phase_modulation": tuple(
        SourceExample(
            settings=PhaseModulation(symbol_rate_hz=Fraction(rate_hz), **fields),
            is_exact=True,
            least_samples=least_samples,
        )
        for rate_hz, least_samples, fields in (
            ("125000", LOOP_SAMPLES, {"scheme": "msk"}),
            ("325000/3", LOOP_SAMPLES, {"scheme": "gmsk", "bt": 0.3, "differential": True}),
            ("100000", LOOP_SAMPLES, {"scheme": "gfsk", "bt": 0.5, "h": Fraction("0.32")}),
            ("50000", 40, {"scheme": "cpfsk", "h": Fraction(7, 10), "levels": 4}),
            ("123456", 2 * LOOP_SAMPLES, {"scheme": "cpfsk", "h": Fraction(1, 3), "levels": 8}),
            ("48000", LOOP_SAMPLES, {"scheme": "four_level_fm"}),
            ("250000", LOOP_SAMPLES, {"scheme": "soqpsk_tg"}),
            ("200000", LOOP_SAMPLES, {"scheme": "oqpsk_half_sine"}),
        )
    ),
    "single_carrier": (
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("qpsk"), symbol_rate_hz=Fraction(250_000)
            )
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("64qam"),
                symbol_rate_hz=Fraction(1_000_000 * 13, 48),
            )
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("8psk"),
                symbol_rate_hz=Fraction(250_000),
                pulse=Rectangular(),
            ),
            is_exact=True,
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("qpsk"), symbol_rate_hz=Fraction(250_000)
            ),
            least_samples=40,
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("8psk"),
                symbol_rate_hz=Fraction(1_000_000 * 13, 48),
                pulse=LinearisedGaussian(),
                rotation=Rotation.parse("3 pi/8"),
            )
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("qpsk"),
                symbol_rate_hz=Fraction(2_000_000, 7),
                pulse=HalfSine(),
                stagger=True,
            ),
            is_exact=True,
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("qpsk"),
                symbol_rate_hz=Fraction(250_000),
                data=PseudoRandom(sequence="pn15"),
                rotation=Rotation.parse("pi/4"),
                differential=True,
            ),
            is_random=False,
        ),
        SourceExample(
            settings=SingleCarrier(
                constellation=Constellation.parse("16apsk 2/3"),
                symbol_rate_hz=Fraction(1_000_000 * 13, 48),
                data=Pattern(bits=BitText.parse("0x0 1234 5678 9ABC DEF")),
            ),
            is_random=False,
            least_samples=97,
        ),
    ),
    "tones": (
        SourceExample(settings=Tones(count=16, spacing_hz=Fraction(10_000)), is_exact=True),
        SourceExample(
            settings=Tones(
                count=32,
                spacing_hz=Fraction(1_000),
                phases="newman",
                notch=Notch(width_hz=Fraction(4_000)),
            ),
            is_random=False,
            is_exact=True,
        ),
        SourceExample(
            settings=Tones(
                phases="optimised",
                tones=(
                    Tone(frequency_offset_hz=Fraction(-123_400), phase_deg=10.0),
                    Tone(frequency_offset_hz=Fraction(-100_000), level_db=-3.0),
                    Tone(frequency_offset_hz=Fraction(5_000)),
                    Tone(frequency_offset_hz=Fraction(60_000)),
                ),
            ),
            is_random=False,
            is_exact=True,
        ),
        SourceExample(
            settings=Tones(
                tones=(
                    Tone(frequency_offset_hz=Fraction(-123_400), phase_deg=10.0),
                    Tone(frequency_offset_hz=Fraction(77_700), level_db=-6.0, phase_deg=0.0),
                ),
            ),
            is_random=False,
            is_exact=True,
        ),
    ),
}


@dataclass(frozen=True, kw_only=True)
class StageExample:
    """How to build a stage or a combiner on one source.

    Parameters
    ----------
    settings : member of STAGES or COMBINERS
    build : callable
        ``(settings, site, source) -> Signal``.
    identity : settings, optional
        The same at zero strength: its output is its input, bit for bit.
    is_measured : bool
        Whether the mean power behind it has no closed form.
    source : settings, optional
        What it is built on; noise if not given.
    is_random : bool
        Whether the stage draws words of its own, by seed, name and place.
    has_zero_strength : bool
        Whether there are settings that change nothing: rounding always does.
    """

    settings: Any
    build: Callable[[Any, Site, Signal], Signal]
    identity: Any = None
    is_measured: bool = False
    source: Any = None
    is_random: bool = False
    has_zero_strength: bool = True


def _stage(settings: Any, site: Site, source: Signal) -> Signal:
    built: Signal = settings.build(site, source)
    return built


def _device(name: str, shelf: str = "device") -> str:
    """Return the path of measured points or coefficients of an invented amplifier or path."""
    return str(Path(__file__).parents[1] / "stages" / shelf / "data" / name)


def _combine(settings: Any, site: Site, source: Signal) -> Signal:
    built: Signal = settings.combine(site, [source] * len(settings.parts))
    return built


SYMBOLS = Ofdm(
    subcarrier_spacing_hz=Fraction(15_625),
    groups=(
        Group(
            subcarriers=IndexSet.parse("-7..-3, -1, 1..3, 5..7"),
            constellation=Constellation.parse("16qam"),
        ),
    ),
    cyclic_prefix=CyclicPrefix.parse(["6 samples", "2 x 5 samples"]),
    edge_window=Stretch.parse("3 samples"),
)
"""OFDM that fills a quarter of the FFT, with two free subcarriers."""
FRAMED = Ofdm(
    subcarrier_spacing_hz=Fraction(15_625),
    groups=(
        Group(
            subcarriers=IndexSet.parse("-18..17"),
            constellation=Constellation.parse("qpsk"),
            symbols=SymbolSet.parse("0, 2"),
            level_db=3.0,
        ),
        Group(
            subcarriers=IndexSet.parse("-12..-1"),
            constellation=Constellation.parse("8psk"),
            symbols=SymbolSet.parse("1"),
            rotation=Rotation.parse("pi/8"),
        ),
    ),
    pilots=(
        Pilots(
            subcarriers=IndexSet.parse("0..15 by 3"),
            values=PilotValues.parse({"random": "qpsk"}),
            symbols=SymbolSet.parse("1"),
        ),
    ),
    cyclic_prefix=CyclicPrefix.parse("1/8"),
    frame_symbols=4,
    half_subcarrier_shift=True,
)
"""OFDM with a schedule, a silent symbol in each frame and a shift, in two thirds of the FFT."""

STAGE_EXAMPLES: dict[str, tuple[StageExample, ...]] = {
    "clip": (
        StageExample(settings=Clip(ceiling_db=5.0), build=_stage, identity=Clip(ceiling_db=60.0)),
        StageExample(settings=Clip(ceiling_db=0.5), build=_stage),
    ),
    "clock_jitter": (
        StageExample(
            settings=ClockJitter(rms_s=2e-8, centre_hz=Fraction(300_000)),
            build=_stage,
            identity=ClockJitter(rms_s=0.0),
            is_random=True,
        ),
    ),
    "clip_filter": (
        StageExample(
            settings=ClipFilter(ceiling_db=5.0, rounds=3),
            build=_stage,
            identity=ClipFilter(ceiling_db=60.0),
        ),
        StageExample(
            settings=ClipFilter(
                ceiling_db=4.0,
                rounds=1,
                passbands=(Passband(low_hz=Fraction(-100_000), high_hz=Fraction(130_000)),),
                transition_hz=Fraction(50_000),
            ),
            build=_stage,
        ),
    ),
    "constellation_extension": (
        StageExample(
            settings=ConstellationExtension(ceiling_db=5.0),
            build=_stage,
            identity=ConstellationExtension(ceiling_db=60.0),
            source=SYMBOLS,
        ),
        StageExample(
            settings=ConstellationExtension(ceiling_db=7.0, rounds=2),
            build=_stage,
            source=FRAMED,
        ),
    ),
    "dc_offset": (
        StageExample(
            settings=DcOffset(level_db=-20.0, phase_deg=30.0),
            build=_stage,
            identity=DcOffset(level_db=-200.0),
        ),
    ),
    "delay": (
        StageExample(
            settings=Delay(delay=TimeSpan.parse("-12.3 us")),
            build=_stage,
            identity=Delay(delay=TimeSpan.parse("0 s")),
        ),
        StageExample(settings=Delay(delay=TimeSpan.parse("30001 samples")), build=_stage),
    ),
    "filter": (
        StageExample(
            settings=Filter(bandwidth_hz=Fraction(100_000), transition_hz=Fraction(20_000)),
            build=_stage,
            is_measured=True,
        ),
        StageExample(
            settings=Filter(
                low_hz=Fraction(-50_000),
                high_hz=Fraction(90_000),
                stopband_db=60.0,
                keep_mean=True,
            ),
            build=_stage,
        ),
        StageExample(
            settings=Filter(taps=FilterTaps.parse([0.5, [0.25, -0.25], 0.0, 0.1])),
            build=_stage,
            identity=Filter(taps=FilterTaps.parse([1])),
            is_measured=True,
        ),
    ),
    "gate": (
        StageExample(
            settings=Gate(
                duty_percent=Fraction(25),
                period=TimeSpan.parse("400 us"),
                ramp=TimeSpan.parse("20 samples"),
            ),
            build=_stage,
            identity=Gate(duty_percent=Fraction(100), period=TimeSpan.parse("1 sample")),
        ),
        StageExample(settings=Gate(pattern="1101", slot=TimeSpan.parse("7 samples")), build=_stage),
    ),
    "generalised_memory_polynomial": (
        StageExample(
            settings=GeneralisedMemoryPolynomial(
                path=_device("crossed.json"), input_back_off_db=15.0
            ),
            build=_stage,
            identity=GeneralisedMemoryPolynomial(path=_device("gain.json"), input_back_off_db=15.0),
        ),
    ),
    "ghorbani": (
        StageExample(
            settings=Ghorbani(input_back_off_db=10.0),
            build=_stage,
            identity=Ghorbani(
                am_am=(1.0, 1.0, 1.0, 0.0),
                am_pm=(0.0, 1.0, 0.0, 0.0),
                input_back_off_db=200.0,
                back_off_from="compression",
            ),
        ),
    ),
    "hold_droop": (
        StageExample(
            settings=HoldDroop(),
            build=_stage,
            identity=HoldDroop(converter_rate_hz=Fraction(10**11)),
            is_measured=True,
        ),
        StageExample(
            settings=HoldDroop(inverse=True, band_hz=Fraction(400_000)),
            build=_stage,
            is_measured=True,
        ),
    ),
    "iq_imbalance": (
        StageExample(
            settings=IqImbalance(gain_db=1.0, phase_deg=-3.0), build=_stage, identity=IqImbalance()
        ),
    ),
    "measured_amplifier": (
        StageExample(
            settings=MeasuredAmplifier(path=_device("amplifier.csv"), input_power_dbm=-6.0),
            build=_stage,
            identity=MeasuredAmplifier(path=_device("linear.csv"), input_power_dbm=0.0),
        ),
        StageExample(
            settings=MeasuredAmplifier(path=_device("amplifier.csv"), input_back_off_db=8.0),
            build=_stage,
        ),
    ),
    "memory_polynomial": (
        StageExample(
            settings=MemoryPolynomial(path=_device("aligned.csv"), input_back_off_db=15.0),
            build=_stage,
            identity=MemoryPolynomial(path=_device("gain.csv"), input_back_off_db=15.0),
        ),
    ),
    "modified_rapp": (
        StageExample(
            settings=ModifiedRapp(input_back_off_db=8.0, back_off_from="compression"),
            build=_stage,
            identity=ModifiedRapp(input_back_off_db=200.0),
        ),
    ),
    "path_response": (
        StageExample(
            settings=PathResponse(path=_device("path.csv", "converter"), inverse=True),
            build=_stage,
            identity=PathResponse(path=_device("flat.csv", "converter")),
            is_measured=True,
        ),
    ),
    "peak_cancellation": (
        StageExample(
            settings=PeakCancellation(ceiling_db=5.0, passes=2),
            build=_stage,
            identity=PeakCancellation(ceiling_db=60.0),
        ),
        StageExample(
            settings=PeakCancellation(ceiling_db=6.0, passes=1, pulse="band"), build=_stage
        ),
    ),
    "peak_windowing": (
        StageExample(
            settings=PeakWindowing(ceiling_db=5.0),
            build=_stage,
            identity=PeakWindowing(ceiling_db=60.0),
        ),
        StageExample(
            settings=PeakWindowing(
                ceiling_db=3.0, window="gaussian", length=TimeSpan.parse("21 us")
            ),
            build=_stage,
        ),
        StageExample(settings=PeakWindowing(ceiling_db=7.0, window="hann"), build=_stage),
    ),
    "phase_noise": (
        StageExample(
            settings=PhaseNoise(
                mask=PhaseMask.parse([["100 Hz", "-50 dBc/Hz"], ["10 kHz", "-80 dBc/Hz"]])
            ),
            build=_stage,
            identity=PhaseNoise(mask=PhaseMask.parse([["1 kHz", "-300 dBc/Hz"]])),
            is_random=True,
        ),
    ),
    "projection": (
        StageExample(
            settings=Projection(ceiling_db=5.0, rounds=4, transition_hz=Fraction(20_000)),
            build=_stage,
            identity=Projection(ceiling_db=60.0),
        ),
        StageExample(
            settings=Projection(ceiling_db=5.0, rounds=6),
            build=_stage,
            identity=Projection(ceiling_db=60.0),
            source=SYMBOLS,
        ),
        StageExample(settings=Projection(ceiling_db=6.0, rounds=3), build=_stage, source=FRAMED),
    ),
    "quantise": (
        StageExample(
            settings=Quantise(bits=8, full_scale_db=9.0),
            build=_stage,
            is_measured=True,
            has_zero_strength=False,
        ),
    ),
    "rapp": (
        StageExample(
            settings=Rapp(smoothness=2.0, input_back_off_db=6.0),
            build=_stage,
            identity=Rapp(input_back_off_db=200.0),
        ),
    ),
    "resample": (
        StageExample(
            settings=Resample(input_rate_hz=Fraction(625_000)),
            build=_stage,
            identity=Resample(input_rate_hz=RATE_HZ),
        ),
        StageExample(settings=Resample(input_rate_hz=Fraction(3_000_000)), build=_stage),
    ),
    "saleh": (
        StageExample(
            settings=Saleh(input_back_off_db=10.0),
            build=_stage,
            identity=Saleh(input_back_off_db=200.0),
        ),
    ),
    "scale": (
        StageExample(settings=Scale(gain_db=-3.0), build=_stage, identity=Scale(gain_db=0.0)),
    ),
    "selected_mapping": (
        StageExample(
            settings=SelectedMapping(candidates=4),
            build=_stage,
            identity=SelectedMapping(candidates=1),
            source=SYMBOLS,
        ),
        StageExample(settings=SelectedMapping(candidates=3), build=_stage, source=FRAMED),
    ),
    "sum": (
        StageExample(
            settings=Sum(
                parts=(
                    Part(signal=None, frequency_offset_hz=Fraction(200_000)),
                    Part(signal=None, frequency_offset_hz=Fraction(-150_000), level_db=-3.0),
                    Part(signal=None, level_db=3.0),
                )
            ),
            build=_combine,
            identity=Sum(parts=(Part(signal=None),)),
        ),
    ),
    "tone_reservation": (
        StageExample(
            settings=ToneReservation(ceiling_db=5.0, count=2),
            build=_stage,
            identity=ToneReservation(ceiling_db=60.0, count=2),
            source=SYMBOLS,
        ),
        StageExample(
            settings=ToneReservation(ceiling_db=7.0, subcarriers=IndexSet.parse("19, -21, -20")),
            build=_stage,
            source=FRAMED,
        ),
    ),
}
