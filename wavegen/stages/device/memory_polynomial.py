"""Amplifier with memory: a polynomial of each delayed sample."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

from annotated_types import Ge, Le, MinLen

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.stages.coefficients import ALIGNED, read_coefficients
from wavegen.stages.polynomial import PolynomialBackOffFrom, drive_polynomial


@dataclass(frozen=True, slots=True, kw_only=True)
class MemoryPolynomial:
    """Settings of a memory polynomial.

    Parameters
    ----------
    path : str
        Coefficients, CSV or JSON, relative to the recipe: ``order,delay,re,im``.
        A comment ``# sample_rate: 122.88 MHz`` (or a key in JSON) says which samples the delays
        count; ``largest_amplitude`` up to which input amplitude the model is known (1 if not
        said).
    input_back_off_db : float
        How far the mean input power (of a gated signal: of its on-time) stands below the
        reference, dB.
    back_off_from : {"full_scale", "compression"}
        The reference at the input: the largest amplitude, or the 1 dB compression point of a
        carrier of constant amplitude.

    Notes
    -----
    ``y[n] = sum c_pq x[n - q] |x[n - q]|^(p - 1)`` over orders ``p`` and delays ``q``: J. Kim,
    K. Konstantinou, "Digital predistortion of wideband signals based on power amplifier model
    with memory", Electronics Letters 37(23), 2001; from memory.
    Beyond the largest amplitude nothing is extrapolated: a signal that peaks there is
    refused. The output has the mean power of the input; the gain that was undone is told. A
    model with memory leaves no law.
    """

    path: Annotated[str, MinLen(1)]
    input_back_off_db: Annotated[float, Ge(-20), Le(200)]
    back_off_from: PolynomialBackOffFrom = "full_scale"

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal behind the amplifier at the mean power it had.

        Raises
        ------
        FileError
            As raised by :func:`wavegen.stages.coefficients.read_coefficients`.
        RecipeError
            As raised by :func:`wavegen.stages.polynomial.drive_polynomial`.
        """
        return drive_polynomial(
            site,
            source,
            read_coefficients(site.folder / self.path, ALIGNED),
            back_off_db=self.input_back_off_db,
            back_off_from=self.back_off_from,
        )
