"""A sign on its sheet: the content as data for the typesetter, and the answer in each form."""

from __future__ import annotations

import io
from collections.abc import Callable
from datetime import date
from functools import lru_cache
from typing import Any, TypeVar

import segno

from service.contract.problem import FieldError, InvalidRequest
from service.sign.content import LeftOut, SignContent, refuse
from service.sign.layout import Sheet, sheet_of
from service.sign.request import SignOptions
from service.sign.symbol import alert_symbol, laser_symbol, symbol_height, viewing_distance_m
from service.sign.tables import sign_tables
from service.web import typeset

Made = TypeVar("Made")
__all__ = ["SetSign", "sign_on_sheet"]

TEMPLATE = "sign/sheet.typ"
#: Side of the QR code as a share of the sign's short side, and squares of white around it.
QR_SHARE = 0.19
QUIET = 4
#: Fields whose text people write, by the row that carries it.
FIELDS = {
    "laser": "evaluation.label",
    "room": "sign.room",
    "officer": "sign.lso_name",
    "extra": "sign.extra_lines",
}
#: Longest address that is printed beside its code.
ADDRESS_LENGTH = 60


class SetSign:
    """A sign ready to be set in any form."""

    def __init__(self, content: SignContent, options: SignOptions, sheet: Sheet) -> None:
        code, why = _code(content.address, sheet)
        if why is not None:
            left_out = [*content.left_out, LeftOut(field="sign.address", reason=why)]
            content = content.model_copy(update={"left_out": left_out})
        self.content = content
        self.sheet = sheet
        self.dated = date.fromisoformat(content.date)
        self.data = _data(content, options, sheet, code)

    def pdf(self) -> bytes:
        """The sheet as PDF. Raises InvalidRequest where the text does not fit or cannot be printed."""
        return self._set(lambda: typeset.pdf(TEMPLATE, self.data, self.dated))

    def picture(self, form: typeset.PageFormat) -> bytes:
        """The sheet as SVG or PNG. Raises as `pdf`."""
        return self._set(lambda: typeset.pages(TEMPLATE, self.data, self.dated, form)[0])

    def facts(self) -> dict[str, Any]:
        """Sizes as set: letter heights [mm], side of the symbol [mm], distances [m]. Raises as `pdf`."""
        return self._set(lambda: dict(typeset.facts(TEMPLATE, self.data)))

    def _set(self, make: Callable[[], Made]) -> Made:
        try:
            return make()
        except typeset.TypesetError as error:
            part = str(error)
            least = self.data["letters"].get(f"{part}_least", 0.0)
            raise refuse(
                "sheet",
                None,
                "a sheet or label with room for the text",
                f"there is no room for the {part} with capitals of {least:.1f} mm, the smallest allowed",
                "Choose a larger sheet, one language, fewer signs, or shorten names and lines.",
            ) from None
        except typeset.Unprintable as error:
            raise _unprintable(error, self.content) from None


def _unprintable(error: typeset.Unprintable, content: SignContent) -> InvalidRequest:
    """The problem for a text with characters that cannot be printed, under the field it came from."""
    shown = ", ".join(f"U+{ord(c):04X}" for c in error.characters[:8])
    place = error.path.split(".")
    field = FIELDS[content.rows[int(place[1])].id if place[0] == "rows" else "laser"]
    problem = FieldError(
        field=field,
        value=None,
        allowed="Latin and Greek letters, digits, punctuation",
        message=f"characters that cannot be printed: {shown}",
        remedy="Write the text without them.",
    )
    return InvalidRequest(f"{field}: {problem.message}", [problem])


def sign_on_sheet(content: SignContent, options: SignOptions) -> SetSign:
    """The sign on its sheet. Raises InvalidRequest where the sheet cannot hold it."""
    return SetSign(content, options, sheet_of(options))


def _code(address: str | None, sheet: Sheet) -> tuple[str | None, str | None]:
    """QR code of an address as SVG, or why there is none."""
    if address is None:
        return None, None
    least = sign_tables().sheets.layout.qr_module_least_mm
    drawn, modules = _drawn(address)
    square = QR_SHARE * min(sheet.sign) / modules
    if square < least:
        return None, (
            f"the code of this address would have squares of {square:.2f} mm, below the {least:g} mm that "
            "are read reliably; a larger sheet or a shorter address carries it"
        )
    return drawn, None


@lru_cache(maxsize=256)
def _drawn(address: str) -> tuple[str, int]:
    """QR code of an address as SVG, and its squares along a side with the quiet edge."""
    code = segno.make(address, error="l", micro=False)
    drawn = io.BytesIO()
    code.save(
        drawn,
        kind="svg",
        border=QUIET,
        xmldecl=False,
        light="#ffffff",
        nl=False,
        omitsize=True,
        svgclass=None,
        lineclass=None,
    )
    return drawn.getvalue().decode(), int(code.symbol_size(border=QUIET)[0])


def _data(content: SignContent, options: SignOptions, sheet: Sheet, code: str | None) -> dict[str, Any]:
    tables = sign_tables()
    layout, symbol = tables.sheets.layout, tables.symbol
    signal = tables.words.signal[content.signal_word] if content.signal_word else None
    phrases = [tables.phrases[key] for key in content.languages]
    label = content.kind in ("label", "aperture")
    detail_least = layout.label_least_mm if label else layout.detail_least_mm
    short_address = content.address and len(content.address) <= ADDRESS_LENGTH
    return {
        "title": content.title,
        "language": content.languages[0],
        "kind": content.kind,
        "page": sheet.page,
        "sign": sheet.sign,
        "corners": sheet.corners,
        "cut": sheet.page != sheet.sign,
        "margin": sheet.margin,
        "letters": {
            "headline_least": max(layout.headline_least_share * sheet.scale, detail_least),
            "headline_most": layout.headline_most_share * sheet.scale,
            "details_least": detail_least,
            "details_good": layout.detail_good_share * layout.detail_most_share * sheet.scale,
            "details_most": max(layout.detail_most_share * sheet.scale, detail_least),
            "label_least": layout.label_least_mm,
            "fine": max(layout.fine_least_mm, layout.fine_share * sheet.scale),
        },
        "signal": signal
        and {
            "texts": content.signal_texts,
            "background": signal.background,
            "text": signal.text,
            "alert": alert_symbol(signal.text, signal.background) if signal.alert else None,
        },
        "yellow": symbol.colours.yellow,
        "symbol": laser_symbol() if content.symbol else None,
        "symbol_height": symbol_height(),
        "viewing": {
            "symbol_m_per_mm": viewing_distance_m(1e-3),
            "letters_m_per_mm": symbol.letters.distance_factor * 1e-3,
            "symbol_words": [p.words["recognised"].split("{}") for p in phrases],
            "letters_words": [p.words["read"].split("{}") for p in phrases],
            "decimal": phrases[0].decimal if len({p.decimal for p in phrases}) == 1 else ".",
        },
        "banner": content.banner,
        "headlines": [h.model_dump() for h in content.headlines],
        "notes": [n.model_dump() for n in content.notes],
        "rows": [{"id": row.id, "label": row.label, "lines": row.lines} for row in content.rows],
        "footer": content.footer,
        "address": content.address if short_address else None,
        "qr": code,
        "qr_mm": QR_SHARE * min(sheet.sign),
    }
