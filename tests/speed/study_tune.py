"""The best method against the least-distortion projection, for the EVM limits of NR.

Run it: ``python tests/speed/study_tune.py`` (about ten minutes on two cores; ``--seconds 30`` is
quicker, ``--only nr`` takes one signal). For each signal and each EVM limit (17.5, 12.5, 8 and
3.5 %: QPSK to 256QAM, 3GPP TS 38.104 Table 6.5.2.2-1) with ACLR of 45 dB or more the tune is made
as ``wavegen tune`` makes it; printed are the level at probability 1e-4 of the best method other
than the projection, that of the projection at the same EVM, and what other data say. Evaluations
of one signal serve all its limits.
"""

from __future__ import annotations

import argparse
import tempfile
from fractions import Fraction
from pathlib import Path

from wavegen.production.fidelity import FidelityRequest
from wavegen.production.neighbours import ChannelRequest
from wavegen.recipe.load import load_text
from wavegen.tuning.limits import Limits
from wavegen.tuning.request import TuneRequest
from wavegen.tuning.tune import tune

HEAD = "wavegen: 1\nseed: 21\nsample_rate: 122.88 MHz\nduration: 10 ms\n"
NR = """signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-636..-1, 1..636", constellation: 64qam}
  cyclic_prefix: 288/4096
  edge_window: 64/4096
"""
TWO = """signal:
  kind: sum
  parts:
    - frequency_offset: -6 MHz
      signal: &cell
        kind: ofdm
        subcarrier_spacing: 15 kHz
        groups:
          - {subcarriers: "-312..-1, 1..312", constellation: 64qam}
        cyclic_prefix: 288/4096
        edge_window: 64/4096
    - {frequency_offset: 6 MHz, level: -3 dB, signal: *cell}
"""
SINGLE = """signal:
  kind: single_carrier
  constellation: 16qam
  symbol_rate: 15.36 MHz
  pulse: {kind: root_raised_cosine, roll_off: 0.22}
"""
SIGNALS = {
    "nr": (NR, ChannelRequest(standard="NR BS FR1", width_hz=Fraction(20_000_000)), ()),
    "two": (TWO, ChannelRequest(), ()),
    "single": (SINGLE, ChannelRequest(), ()),
}
EVMS = {"QPSK": 17.5, "16QAM": 12.5, "64QAM": 8.0, "256QAM": 3.5}


def main():
    """Print one line a signal and limit."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seconds", type=float, default=60.0, help="for each limit")
    parser.add_argument("--only", choices=SIGNALS, action="append")
    parser.add_argument("--workers", type=int, default=2)
    given = parser.parse_args()
    for name in given.only or SIGNALS:
        text, channels, methods = SIGNALS[name]
        with tempfile.TemporaryDirectory() as folder:
            for modulation, percent in EVMS.items():
                request = TuneRequest(
                    limits=Limits(evm_percent=percent, aclr_db=45.0),
                    fidelity=FidelityRequest(channels=channels, must_hold=True),
                    probability=1e-4,
                    methods=methods,
                    seconds=given.seconds,
                )
                loaded = load_text(HEAD + text, name=name)
                tuned = tune(
                    loaded, request, out=Path(folder), overwrite=True, workers=given.workers
                )
                print(line(name, modulation, tuned.document()), flush=True)


def line(name, modulation, document):
    """Return the outcome of one tune in a line."""
    best = document["best"]
    if best is None:
        return f"{name:6s} {modulation:7s} none keeps the limits: {document['nearest']}"
    bound = "no reference" if best["bound_db"] is None else f"{best['over_bound_db']:+.2f} dB to it"
    said = document["confirmation"]
    return (
        f"{name:6s} {modulation:7s} {best['stage']}: {best['level_db']:.2f} dB, EVM "
        f"{best['evm_percent']:.2f} %, ACLR {best['aclr_db']:.1f} dB; {bound}; other data: "
        f"{said['level_db']['mean']:.2f} dB, EVM {said['evm_percent']['mean']:.2f} %, "
        f"{said['verdict']}"
    )


if __name__ == "__main__":
    main()
