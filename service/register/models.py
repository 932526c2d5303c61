"""What the register takes and gives: laser, revision, decision, pair of eyewear, event."""

from __future__ import annotations

import unicodedata
from datetime import date
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, Field

from service.contract.request import EvaluationRequest, Eyewear
from service.contract.result import Model
from service.contract.strict import Strict

__all__ = [
    "Decision",
    "DecisionIn",
    "Event",
    "EyeFigures",
    "EyewearIn",
    "EyewearRecord",
    "Figures",
    "Laser",
    "LaserIn",
    "LaserPage",
    "LaserSummary",
    "ReviewIn",
    "Revision",
    "RevisionDocument",
    "State",
    "Status",
]

Status = Literal["draft", "submitted", "approved", "retired"]
State = Literal["draft", "submitted", "approved", "returned", "superseded"]


def clean(value: str) -> str:
    """Text without blanks around it. Raises ValueError for control characters."""
    text = value.strip()
    if any(unicodedata.category(c) in ("Cc", "Cs") for c in text):
        raise ValueError("a control character (line break, tab or NUL) in the text")
    return text


def cleaned_lines(value: str) -> str:
    """Text of several lines. Raises ValueError for other control characters."""
    text = value.replace("\r\n", "\n").strip()
    if any(unicodedata.category(c) in ("Cc", "Cs") and c != "\n" for c in text):
        raise ValueError("a control character in the text")
    return text


def _filled(value: str) -> str:
    if not value:
        raise ValueError("blank")
    return value


def _date(value: str | None) -> str | None:
    if value is None:
        return None
    try:
        found = date.fromisoformat(value)
    except ValueError:
        raise ValueError("no date; write it as 2027-01-31") from None
    if found.isoformat() != value:
        raise ValueError("no date; write it as 2027-01-31")
    return value


def _blank_is_none(value: Any) -> Any:
    return None if value == "" else value


Tag = Annotated[str, Field(max_length=60), AfterValidator(clean), AfterValidator(_filled)]
Text = Annotated[str, Field(max_length=200), AfterValidator(clean)]
Reason = Annotated[str, Field(max_length=500), AfterValidator(clean)]
Comment = Annotated[str, Field(max_length=2000), AfterValidator(cleaned_lines)]
DayText = Annotated[str, Field(max_length=10, json_schema_extra={"format": "date"})]
Day = Annotated[DayText | None, BeforeValidator(_blank_is_none), AfterValidator(_date)]


class LaserIn(Strict):
    """A laser as it is sent: identity and evaluation request."""

    asset_tag: Tag = Field(description="Inventory number, unique in the register.")
    label: Text = Field("", description="Name of the laser; blank: the label of the request.")
    place: Text = Field("", description="Building and room.")
    owner: Text = Field("", description="Who answers for it.")
    manufacturer: Text = Field("", description="Maker and type, free text.")
    review_due: Day = Field(None, description="Next review, YYYY-MM-DD.")
    reason: Reason = Field("", description="Why the request changes; kept with the revision.")
    request: EvaluationRequest = Field(description="As for POST /api/v1/evaluate.")

    @property
    def name(self) -> str:
        """The label, or that of the request."""
        return self.label or self.request.label

    @property
    def asked(self) -> EvaluationRequest:
        """The request under the name of the laser."""
        return self.request.model_copy(update={"label": self.name})


class DecisionIn(Strict):
    """A comment with a decision; a next review date with an approval."""

    comment: Comment = Field("", description="Needed to return a revision.")
    review_due: Day = Field(None, description="Next review, YYYY-MM-DD; approvals only.")


class ReviewIn(Strict):
    """A new date of review."""

    review_due: Day = Field(description="Next review, YYYY-MM-DD; null = none.")


def _longest(*ends_m: float | None) -> float | None:
    return None if None in ends_m else max(e for e in ends_m if e is not None)


class EyeFigures(Model):
    """The key figures of the eye in a case of its own: behind the optical aid, or when a sweep stops."""

    hazard_distance_m: float | None = Field(description="0 = nothing exceeded; null = unbounded.")
    hazard_ratio: float
    optical_density: float


class Figures(Model):
    """The key figures of a result."""

    rules: str
    wavelengths_nm: list[float]
    hazard_classes: dict[str, str] = Field(description="Class under every scheme, the default first.")
    eye_hazard_distance_m: float | None = Field(description="0 = nothing exceeded; null = unbounded.")
    skin_hazard_distance_m: float | None
    eye_hazard_ratio: float
    skin_hazard_ratio: float
    optical_density: float = Field(description="For the eye, at the most hazardous place.")
    eye_governing: str
    skin_governing: str
    aided: EyeFigures | None = Field(None, description="Null where the request names no optical aid.")
    stopped: EyeFigures | None = Field(
        None, description="When the sweeping beam stops, without the aid; null where nothing sweeps."
    )
    stopped_aided: EyeFigures | None = Field(
        None, description="When the sweeping beam stops, behind the optical aid; null without one of both."
    )
    stopped_skin_hazard_distance_m: float | None = Field(
        0.0, description="The skin then; 0 = nothing exceeded or nothing sweeps, null = unbounded."
    )

    @property
    def _eyes(self) -> list[EyeFigures]:
        return [case for case in (self.aided, self.stopped, self.stopped_aided) if case is not None]

    @property
    def worst_eye_distance_m(self) -> float | None:
        """The longest hazard distance, with and without aid, sweeping and stopped [m]; None = unbounded."""
        return _longest(self.eye_hazard_distance_m, *(case.hazard_distance_m for case in self._eyes))

    @property
    def worst_skin_distance_m(self) -> float | None:
        """The longer of the skin's hazard distances, sweeping and stopped [m]; None = unbounded."""
        return _longest(self.skin_hazard_distance_m, self.stopped_skin_hazard_distance_m)

    @property
    def worst_density(self) -> float:
        """The largest of the densities: with and without the aid, sweeping and stopped."""
        return max(self.optical_density, *(case.optical_density for case in self._eyes), 0.0)

    @property
    def hazard_class(self) -> str:
        """The class under the default scheme."""
        return next(iter(self.hazard_classes.values()))


class LaserSummary(Model):
    """A laser in a list; the figures are those of the current revision."""

    id: int
    asset_tag: str
    label: str
    place: str
    owner: str
    manufacturer: str
    status: Status
    version: int = Field(description="Grows with every change; the ETag carries it.")
    revision: int = Field(description="Number of the current revision.")
    approved_revision: int | None = Field(description="Number of the revision in force.")
    review_due: str | None
    overdue: bool
    created_at: str
    updated_at: str
    rules: str
    hazard_class: str
    eye_hazard_distance_m: float | None
    skin_hazard_distance_m: float | None
    optical_density: float
    wavelengths_nm: str
    tables_current: bool = Field(description="Whether the tables are still those that made the figures.")


class Decision(Model):
    """One step of the sign-off."""

    action: Literal["submitted", "withdrawn", "approved", "returned"]
    by: str
    at: str
    comment: str


class Revision(Model):
    """A revision in the history of a laser."""

    number: int
    state: State
    created_at: str
    created_by: str
    reason: str
    service_version: str
    tables: dict[str, str] = Field(description="Digest of every table that the result rests on.")
    request_digest: str
    result_digest: str | None = Field(description="Null until the whole result is kept, from submission on.")
    figures: Figures
    decisions: list[Decision]


class RevisionDocument(Revision):
    """A revision with its request and, where it is kept, the whole result."""

    request: dict[str, Any]
    result: dict[str, Any] | None


class Laser(LaserSummary):
    """A laser with the request and the figures of its current revision."""

    request: dict[str, Any]
    current: Revision


class LaserPage(Model):
    """One page of a list; `next` is the cursor of the following page."""

    items: list[LaserSummary]
    next: str | None
    total: int


class EyewearIn(Strict):
    """Pairs of one kind on the shelf."""

    tag: Tag = Field(description="Inventory number, unique on the shelf.")
    pair: Eyewear = Field(description="As in the list `eyewear` of a request.")
    quantity: int = Field(1, ge=0, le=100_000)
    place: Text = ""
    inspection_due: Day = Field(None, description="Next inspection, YYYY-MM-DD.")
    retired: bool = Field(False, description="True: no longer in use; never offered.")


class EyewearRecord(Model):
    """Pairs of one kind on the shelf."""

    id: int
    tag: str
    pair: dict[str, Any]
    quantity: int
    place: str
    inspection_due: str | None
    inspection_overdue: bool
    retired: bool
    version: int
    created_at: str
    updated_at: str


class Event(Model):
    """One entry of the audit log; `digest` covers the entry and the one before."""

    id: int
    at: str
    actor: str
    via: str
    action: str
    subject: str
    subject_id: int
    detail: dict[str, Any]
    previous: str
    digest: str
