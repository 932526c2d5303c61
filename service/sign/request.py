"""The request for a sign: an evaluation and how the sign is to look. Unknown fields are refused."""

from __future__ import annotations

import re
import unicodedata
from datetime import date
from typing import Annotated, Literal

from pydantic import AfterValidator, Field

from service.contract.request import EvaluationRequest, Strict

__all__ = ["SignOptions", "SignRequest"]

ADDRESS = re.compile(r"https?://[!-~]+")


def _composed(text: str) -> str:
    """Letters and their accents as one character each, no blanks around."""
    text = unicodedata.normalize("NFC", text).strip()
    if "\n" in text or "\t" in text:
        raise ValueError("a line break or tab; give one line of text")
    return text


def _day(text: str) -> str:
    try:
        parsed = date.fromisoformat(text)
    except ValueError:
        raise ValueError("not a date; write it as 2026-12-01") from None
    if text != parsed.isoformat():
        raise ValueError("not a date in this form; write it as 2026-12-01")
    return text


def _address(text: str) -> str:
    if not ADDRESS.fullmatch(text):
        raise ValueError("not an http or https address of plain characters")
    return text


Day = Annotated[str, AfterValidator(_day), Field(max_length=10)]
ExtraLine = Annotated[str, AfterValidator(_composed), Field(min_length=1, max_length=120)]
Language = Literal["en", "de", "fr", "es", "it", "nl"]


class SignOptions(Strict):
    """How the sign is to look, and what the evaluation does not know."""

    family: Literal["iso", "ansi"] = Field(
        "iso", description="iso: warning triangle with a text panel; ansi: signal word, symbol, message."
    )
    kind: Literal["area", "temporary", "label", "aperture"] = Field(
        "area",
        description="area: sign for the door; temporary: the same for a controlled area with dates; label: "
        "warning and explanatory label for the housing; aperture: label beside the aperture.",
    )
    sheet: Literal["A3", "A4", "A5", "A6", "Letter", "own"] = Field(
        "A4", description="Paper; own: a page of the label's own size."
    )
    orientation: Literal["portrait", "landscape"] = "portrait"
    label_mm: list[Annotated[float, Field(ge=10, le=297)]] | None = Field(
        None, min_length=2, max_length=2, description="Width and height of a label in mm; default 100 x 50."
    )
    copies: int = Field(
        1, ge=1, le=200, description="Signs on the sheet: 1, 2 or 4; labels: as many as fit at most."
    )
    languages: list[Language] = Field(
        default=["en"], min_length=1, max_length=2, description="One language or two."
    )
    scheme: str = Field(
        "iec-60825-1-2014", max_length=100, description="Classification scheme; see GET /api/v1/classes."
    )
    signal_word: Literal["auto", "danger", "warning", "caution"] = Field(
        "auto", description="Family ansi: a stronger word than the class takes; never a weaker one."
    )
    extra_lines: list[ExtraLine] = Field(default_factory=list, max_length=4, description="In your own words.")
    room: Annotated[str, AfterValidator(_composed)] | None = Field(None, max_length=80)
    lso_name: Annotated[str, AfterValidator(_composed)] | None = Field(
        None, max_length=80, description="Laser safety officer; default: the setting of the site."
    )
    lso_phone: Annotated[str, AfterValidator(_composed)] | None = Field(
        None, max_length=40, description="Telephone of the laser safety officer; default: the setting."
    )
    whole_room: bool = Field(False, description="Print 'whole room' in place of a hazard distance.")
    date: Day | None = Field(None, description="Date of the assessment, YYYY-MM-DD; default: today (UTC).")
    valid_from: Day | None = Field(None, description="First day of a temporary controlled area.")
    valid_to: Day | None = Field(None, description="Last day of a temporary controlled area.")
    address: Annotated[str, AfterValidator(_address)] | None = Field(
        None, max_length=2000, description="Address of the assessment, printed and as a QR code."
    )


class SignRequest(Strict):
    """An evaluation and the sign to make from it."""

    evaluation: EvaluationRequest
    sign: SignOptions = Field(default_factory=SignOptions)
