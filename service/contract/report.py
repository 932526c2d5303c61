"""The request for a report: an evaluation, the paper, and what the evaluation does not know."""

from __future__ import annotations

import re
from datetime import date
from typing import Annotated, Literal

from pydantic import AfterValidator, Field

from service.contract.request import EvaluationRequest
from service.contract.strict import Strict

__all__ = ["PAPERS", "Paper", "ReportRequest", "day_of"]

Paper = Literal["a4", "letter"]
PAPERS: tuple[Paper, ...] = ("a4", "letter")
DAY = re.compile(r"\d{4}-\d{2}-\d{2}", re.ASCII)
#: Days that a PDF can bear.
FIRST, LAST = date(2000, 1, 1), date(2999, 12, 31)


def day_of(text: str) -> date:
    """A day written as 2026-12-01. Raises ValueError."""
    try:
        day = date.fromisoformat(text) if DAY.fullmatch(text) else None
    except ValueError:
        day = None
    if day is None or not FIRST <= day <= LAST:
        raise ValueError("not a day between 2000 and 2999 written as 2026-12-01")
    return day


def _checked(text: str) -> str:
    day_of(text)
    return text


class ReportRequest(Strict):
    """One laser as a report on paper. The same request gives the same bytes."""

    evaluation: EvaluationRequest
    paper: Paper = "a4"
    date: Annotated[str, AfterValidator(_checked)] | None = Field(
        None, max_length=10, description="Day of the report, as 2026-12-01; without it the present day (UTC)."
    )
    place: str = Field("", max_length=200, description="Where the laser stands.")
    asked_by: str = Field("", max_length=200, description="Who asks for the evaluation.")
