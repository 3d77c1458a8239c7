"""Files on disk judged by the law of the recipe in their sidecar."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

from wavegen.core.errors import FileError, RecipeError, SignalError
from wavegen.core.progress import Progress
from wavegen.core.render import Tap, render
from wavegen.dsp.bursts import Bursts
from wavegen.files.analytic import looped
from wavegen.files.format import Recording
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.meters.evm_probe import measure_evm, total_tap
from wavegen.production.export import Channel
from wavegen.production.figures import has_symbols
from wavegen.production.judgement import (
    DEFAULT,
    Judgement,
    Question,
    data_samples_of,
    judge,
    law_of,
)
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.sidecar import rounded, versions
from wavegen.production.stimulus import Stimulus, recipe_channel
from wavegen.recipe.load import load_text
from wavegen.stages.channel.gate import on_time

STATED, MEASURED = "as its sidecar says", "measured"


@dataclass(frozen=True, eq=False, kw_only=True)
class Referee:
    """Judges the files of one stimulus. Use :meth:`of`.

    Parameters
    ----------
    stimulus : Stimulus
        Its sidecar.
    question : Question
        What is asked.
    is_stated : bool
        Whether that is what the sidecar answers already.
    workers, progress
        As in :func:`wavegen.core.render.render`.
    """

    stimulus: Stimulus
    question: Question
    is_stated: bool
    workers: int
    progress: Progress

    @classmethod
    def of(
        cls,
        stimulus: Stimulus,
        question: Question | None,
        *,
        workers: int,
        progress: Progress,
    ) -> Referee:
        """Return the referee of a stimulus; its sidecar fills in what is not asked."""
        law = stimulus.document["law"] or {}
        stated = Question(
            tolerance_db=law.get("tolerance_db") or DEFAULT.tolerance_db,
            down_to=law.get("down_to") or DEFAULT.down_to,
        )
        return cls(
            stimulus=stimulus,
            question=question or stated,
            is_stated=question is None or question == stated,
            workers=workers,
            progress=progress,
        )

    def judge(
        self, item: dict[str, Any], recordings: Sequence[Recording], *, is_same: bool
    ) -> dict[str, Any] | None:
        """Return how each channel of a file compares with its law.

        Parameters
        ----------
        item : dict
            Its entry in the sidecar.
        recordings : sequence of Recording
            Its channels.
        is_same : bool
            Whether the bytes are those of the sidecar.

        Returns
        -------
        dict or None
            None where no channel has a law.

        Raises
        ------
        SignalError
            A sample is not finite, or all are zero.
        FileError
            The file cannot be read to its end.
        """
        entries = item["channels"] or [item]
        if not any(entry["against_law"] for entry in entries):
            return None
        if is_same and self.is_stated:
            return {"from": STATED, "channels": [entry["against_law"] for entry in entries]}
        found = [
            self._judged(recording, number) if entry["against_law"] else None
            for number, (recording, entry) in enumerate(zip(recordings, entries, strict=True))
        ]
        rows = [item and {"verdict": item.verdict, "statement": item.statement} for item in found]
        return {"from": MEASURED, "channels": rows}

    def _judged(self, recording: Recording, number: int) -> Judgement | None:
        if isinstance(self._laws, str):
            text = f"undecided: {self._laws}"
            return Judgement(verdict="undecided", statement=text)
        law, bursts = self._laws[recipe_channel(self.stimulus.document, number)]
        signal = looped(recording)
        channel = Channel(
            signal=signal,
            bursts=bursts,
            data_samples=data_samples_of(law, signal, workers=self.workers),
        )
        taps = tuple(
            Tap(name=str(k), signal=signal, meter=meter) for k, meter in enumerate(channel.meters)
        )
        read = render(
            signal,
            taps=taps,
            workers=self.workers,
            progress=self.progress,
            task=f"measuring {recording.path.name}",
        )
        codes = channel.codes(iter(read.values()), signal, loops=True)
        return judge(law, codes, recording.datatype, self.question)

    def waveform(self, recording: Recording, number: int) -> dict[str, Any] | None:
        """Return how far the samples of a file stand from those that its recipe makes.

        Parameters
        ----------
        recording : Recording
            One channel of the file.
        number : int
            Which.

        Returns
        -------
        dict or None
            ``error_percent`` of the whole waveform, the gain fitted, and ``evm`` of the symbols
            of each source. None where the recipe makes no such samples here: another version of
            the program, another rate or length, or real samples around an intermediate frequency.

        Raises
        ------
        SignalError
            A sample is not finite, or all are zero.
        FileError
            The file cannot be read to its end.
        """
        document = self.stimulus.document
        is_ours = (document.get("versions") or {}).get("wavegen") == versions()["wavegen"]
        if isinstance(self._channels, str) or not is_ours or recording.datatype.is_real:
            return None
        sent = self._channels[recipe_channel(document, number)].built.signal
        seen = looped(recording)
        if (seen.n_samples, seen.sample_rate_hz) != (sent.n_samples, sent.sample_rate_hz):
            return None
        how: dict[str, Any] = {"workers": self.workers, "progress": self.progress}
        total = render(seen, taps=(total_tap(sent, seen),), task="waveform", **how)
        error = next(iter(total.values())).fitted_percent
        found = measure_evm(sent, seen, **how) if has_symbols(sent)[0] else []
        return {
            "error_percent": rounded(error, 4),
            "evm": [
                {"path": item.path, "percent": rounded(item.overall.fitted_percent, 4)}
                for item in found
            ],
        }

    @cached_property
    def _laws(self) -> list[tuple[Law | NoLaw, Bursts | None]] | str:
        """Return the law and the on-time of each channel, or why they are not known here."""
        if isinstance(self._channels, str):
            return self._channels
        return [(law_of(channel), on_time(channel.built.signal)) for channel in self._channels]

    @cached_property
    def _channels(self) -> Sequence[Prepared] | str:
        """Return what the recipe in the sidecar makes, or why it cannot be built here."""
        document = self.stimulus.document
        recipe = document["recipe"]
        try:
            loaded = load_text(
                recipe["text"],
                name=recipe["name"],
                overrides=recipe["overrides"],
                folder=self.stimulus.path.parent,
            )
            if loaded.recipe.sample_rate_hz != Fraction(document["sample_rate_exact_hz"]):
                return "its rate is not that of its recipe"
            return prepare(loaded).channels
        except (RecipeError, FileError, SignalError) as error:
            return f"the recipe in the sidecar cannot be built here ({error})"


def law_verdicts_of(row: dict[str, Any]) -> list[str]:
    """Return the verdicts of the channels of a checked file that have a law."""
    found = row["against_law"]
    return [item["verdict"] for item in found["channels"] if item] if found else []
