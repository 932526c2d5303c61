"""Axes of charts: where a value stands, and which values are written beside the axis."""

from __future__ import annotations

import math
from dataclasses import dataclass

from service.web.runs import Run

__all__ = ["Axis", "Tick", "decades", "number_runs"]

#: Most labels along an axis.
LABELS = 8
#: Decades written out as decimals; others as powers of ten.
WRITTEN = (-3, 4)
#: A logarithmic axis this short is labelled in even steps.
STEPS_BELOW = 20.0


@dataclass(frozen=True, slots=True)
class Tick:
    """A place on an axis; its label is empty on small ticks."""

    at: float
    label: list[Run]


def decades(low: float, high: float) -> tuple[float, float]:
    """Whole decades that hold both values, both above 0."""
    below = math.floor(math.log10(low) + 1e-9)
    above = math.ceil(math.log10(high) - 1e-9)
    return 10.0**below, 10.0 ** max(above, below + 1)


def number_runs(value: float) -> list[Run]:
    """A tick's value: 0.01, 250, or 2 × 10 to a power."""
    if value == 0.0:
        return [Run("0", "")]
    exponent = math.floor(math.log10(abs(value)) + 1e-9)
    if WRITTEN[0] <= exponent <= WRITTEN[1]:
        return [Run(f"{value:.6g}".replace("-", "−"), "")]
    mantissa = f"{value / 10.0**exponent:.4g}"
    power = Run(str(exponent).replace("-", "−"), "sup")
    return [Run("10" if mantissa == "1" else f"{mantissa} × 10", ""), power]


@dataclass(frozen=True, slots=True)
class Axis:
    """From `low` at `start` to `high` at `end` (drawing units), logarithmic or linear."""

    low: float
    high: float
    start: float
    end: float
    log: bool = True

    def at(self, value: float) -> float:
        """Where a value stands; values outside stand at most one length of the axis outside."""
        if self.log:
            part = math.log(value / self.low) / math.log(self.high / self.low) if value > 0.0 else -1.0
        else:
            part = (value - self.low) / (self.high - self.low)
        return self.start + min(max(part, -1.0), 2.0) * (self.end - self.start)

    def ticks(self) -> list[Tick]:
        """Labelled and small ticks in order."""
        return self._decades() if self.log and self.high / self.low >= STEPS_BELOW else self._steps()

    def _decades(self) -> list[Tick]:
        first = math.floor(math.log10(self.low) + 1e-9)
        last = math.ceil(math.log10(self.high) - 1e-9)
        every = -(-(last - first + 1) // LABELS)
        labelled = (1,) if last - first > 2 else (1, 2, 5)
        small = range(1, 10) if every == 1 else (1,)
        found = []
        for exponent in range(first, last + 1):
            for digit in small:
                value = digit * 10.0**exponent
                if not self.low * (1 - 1e-9) <= value <= self.high * (1 + 1e-9):
                    continue
                shown = digit in labelled and (exponent - first) % every == 0
                found.append(Tick(self.at(value), number_runs(value) if shown else []))
        return found

    def _steps(self) -> list[Tick]:
        wide = (self.high - self.low) / (LABELS - 2)
        unit = 10.0 ** math.floor(math.log10(wide))
        step = next(s * unit for s in (1, 2, 5, 10) if s * unit >= wide * (1 - 1e-9))
        first = math.ceil(self.low / step - 1e-9)
        last = math.floor(self.high / step + 1e-9)
        return [Tick(self.at(k * step), number_runs(k * step)) for k in range(first, last + 1)]
