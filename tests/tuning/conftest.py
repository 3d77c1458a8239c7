"""Evaluations as the tests need them, and a small cell to be tuned."""

from types import SimpleNamespace

import pytest

from wavegen.recipe.dump import stage_text
from wavegen.tuning.evaluation import AclrEntry, Evaluation, EvmEntry
from wavegen.tuning.journal import Journal
from wavegen.tuning.limits import Limits
from wavegen.tuning.space import space_of
from wavegen.tuning.trials import Trials

CELL = """wavegen: 1
title: Pier cell   # for the tests
seed: 5
sample_rate: 7.68 MHz
duration: 70 symbols
# one carrier
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-36..-1, 1..36", constellation: 64qam}
  cyclic_prefix: 36/512
  edge_window: 32/512   # leaves room beside it
"""


def entry(percent, source="signal", name="all", constellation="64qam"):
    return EvmEntry(source=source, name=name, constellation=constellation, percent=percent)


def evaluation(
    *, method="clip", text="{kind: clip}", level_db=6.0, percent=5.0, ratio_db=50.0, **more
):
    given = {
        "settings": {"ceiling_db": level_db},
        "peak_db": level_db + 0.1,
        "evm": (entry(percent), entry(percent, name="groups[0]")),
        "aclr": tuple(
            AclrEntry(name="first", offset_hz=offset, ratio_db=ratio_db, limit_db=45.0)
            for offset in (-2e6, 2e6)
        ),
    }
    return Evaluation(method=method, text=text, level_db=level_db, **{**given, **more})


@pytest.fixture
def made():
    return SimpleNamespace(evaluation=evaluation, entry=entry, CELL=CELL)


class Bench:
    """A method whose EVM falls by 5 dB with each dB of ceiling, 8 % at 6 dB."""

    def __init__(self, made, seconds=1.0):
        self.made, self.seconds, self.clock, self.n = made, seconds, 0.0, 0

    def try_out(self, space, stage):
        self.n += 1
        self.clock += self.seconds
        percent = 8 * 10 ** ((6.0 - stage.ceiling_db) * 5 / 20) * (1 + 0.1 / stage.rounds)
        return self.made.evaluation(
            method=space.kind,
            text=stage_text(stage),
            settings=space.told(stage),
            level_db=stage.ceiling_db + 0.2 / stage.rounds,
            percent=percent,
            pairs=float(stage.rounds),
        )


@pytest.fixture
def space():
    return space_of("clip_filter", None, band_hz=1e6, highest_db=11.0)


@pytest.fixture
def begun(tmp_path, made):
    def begun(seconds=100.0, **more):
        bench = Bench(made, **more)
        trials = Trials(
            bench=bench,
            journal=Journal(tmp_path / "x.tuning.json", {"key": 1}),
            limits=Limits(evm_percent=8.0),
            now=lambda: bench.clock,
        )
        trials.begin(seconds)
        return trials, bench

    return begun
