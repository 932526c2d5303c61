"""Where signs lie on a sheet, and how small their letters may become."""

from __future__ import annotations

import math
from dataclasses import dataclass

from service.sign.content import refuse
from service.sign.request import SignOptions
from service.sign.tables import sign_tables

__all__ = ["Sheet", "capacity", "sheet_of"]

Size = tuple[float, float]
DEFAULT_LABEL: Size = (100.0, 50.0)


@dataclass(frozen=True, slots=True)
class Sheet:
    """A page [mm], the signs on it, left upper corners in order, and the free edge inside each sign."""

    page: Size
    sign: Size
    corners: tuple[Size, ...]
    margin: float

    @property
    def scale(self) -> float:
        """Square root of a sign's area [mm]."""
        return math.sqrt(self.sign[0] * self.sign[1])


def _page(options: SignOptions) -> Size:
    width, height = sign_tables().sheets.sheet[options.sheet]
    return (width, height) if options.orientation == "portrait" else (height, width)


def _label(options: SignOptions) -> Size:
    if options.label_mm is None:
        return DEFAULT_LABEL
    size = (options.label_mm[0], options.label_mm[1])
    limits = sign_tables().sheets.labels
    least, most = sorted(limits.least), sorted(limits.most)
    if any(not low <= s <= high for s, low, high in zip(sorted(size), least, most, strict=True)):
        raise refuse(
            "label_mm",
            f"{size[0]:g} x {size[1]:g}",
            f"{limits.least[0]:g} x {limits.least[1]:g} to {limits.most[0]:g} x {limits.most[1]:g} mm",
            "no size for a label",
            "Give width and height in millimetres.",
        )
    return size


def _grid(options: SignOptions, label: Size) -> tuple[int, int]:
    """Columns and rows of labels that fit on the paper between its free edges."""
    layout, page = sign_tables().sheets.layout, _page(options)
    free = [side - 2.0 * layout.margin_least_mm + layout.cut_gap_mm for side in page]
    columns, rows = (int(f // (s + layout.cut_gap_mm)) for f, s in zip(free, label, strict=True))
    return columns, rows


def capacity(options: SignOptions) -> int:
    """How many labels the sheet holds; 1 for a page of the label's own size."""
    if options.sheet == "own":
        return 1
    columns, rows = _grid(options, _label(options))
    return columns * rows


def sheet_of(options: SignOptions) -> Sheet:
    """The sheet of a sign. Raises InvalidRequest where it cannot hold what is asked for."""
    return _labels(options) if options.kind in ("label", "aperture") else _signs(options)


def _signs(options: SignOptions) -> Sheet:
    if options.label_mm is not None:
        remedy = "Leave it out, or ask for kind label or aperture."
        raise refuse("label_mm", None, "no value", "only labels have a size of their own", remedy)
    if options.sheet == "own":
        allowed = ", ".join(sign_tables().sheets.sheet)
        raise refuse("sheet", "own", allowed, "only labels have a page of their own size", "Choose a paper.")
    if options.copies not in (1, 2, 4):
        remedy = "Choose 1, 2 or 4 signs on a sheet."
        raise refuse("copies", options.copies, "1, 2, 4", "a sheet is not cut that way", remedy)
    width, height = page = _page(options)
    columns, rows = {1: (1, 1), 2: (1, 2) if height > width else (2, 1), 4: (2, 2)}[options.copies]
    sign = (width / columns, height / rows)
    layout = sign_tables().sheets.layout
    corners = tuple((c * sign[0], r * sign[1]) for r in range(rows) for c in range(columns))
    return Sheet(page, sign, corners, max(layout.margin_least_mm, layout.margin_share * min(sign)))


def _labels(options: SignOptions) -> Sheet:
    layout, label = sign_tables().sheets.layout, _label(options)
    most = capacity(options)
    if options.copies > most:
        message = f"only {most} such labels fit on this sheet" if most else "no such label fits on this sheet"
        allowed = f"1 to {most}" if most else "a larger sheet or a smaller label"
        remedy = "Ask for fewer, turn the sheet, or choose a larger one."
        raise refuse("copies" if most else "label_mm", options.copies, allowed, message, remedy)
    margin = layout.label_margin_share * min(label)
    if options.sheet == "own":
        return Sheet(label, label, ((0.0, 0.0),), margin)
    columns, _ = _grid(options, label)
    edge, step = layout.margin_least_mm, [s + layout.cut_gap_mm for s in label]
    corners = tuple(
        (edge + k % columns * step[0], edge + k // columns * step[1]) for k in range(options.copies)
    )
    return Sheet(_page(options), label, corners, margin)
