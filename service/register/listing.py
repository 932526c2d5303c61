"""Lists of lasers: search, filters, order, pages by cursor, counts for the overview."""

from __future__ import annotations

import base64
import binascii
import json
from typing import Annotated, Any, Literal

import sqlalchemy as sa
from pydantic import Field

from service.contract.answer import rule_sets
from service.contract.problem import InvalidRequest
from service.contract.strict import Strict
from service.register.clock import today
from service.register.figures import tables_digest
from service.register.models import Day, LaserPage, Text
from service.register.problems import field_error
from service.register.schema import lasers
from service.register.stored import MOST, summary

__all__ = ["SORTS", "Filters", "Sort", "overview", "page_of", "stale"]

Sort = Literal[
    "asset_tag", "label", "place", "owner", "status", "class", "distance", "density", "review", "updated"
]
LATE = "9999-12-31"
#: Unbounded distances are the longest.
UNBOUNDED = 1e300
SORTS: dict[str, sa.ColumnElement[Any]] = {
    "asset_tag": lasers.c.asset_tag,
    "label": lasers.c.label,
    "place": lasers.c.place,
    "owner": lasers.c.owner,
    "status": lasers.c.status,
    "class": lasers.c.class_rank,
    "distance": sa.func.coalesce(lasers.c.eye_distance_m, UNBOUNDED),
    "density": lasers.c.optical_density,
    "review": sa.func.coalesce(lasers.c.review_due, LATE),
    "updated": lasers.c.updated_at,
}


class Filters(Strict):
    """Which lasers, in which order."""

    q: Text = Field("", description="Words found in tag, label, place, owner or manufacturer.")
    asset_tag: Text = ""
    status: Literal["", "current", "draft", "submitted", "approved", "retired"] = Field(
        "", description="One status; current = every one but retired."
    )
    hazard_class: Annotated[str, Field(max_length=10)] = ""
    place: Text = ""
    owner: Text = ""
    rules: Text = ""
    overdue: bool = Field(False, description="Only lasers whose review is overdue.")
    due_before: Day = Field(None, description="Only lasers whose review is due before this date.")
    stale: bool = Field(False, description="Only lasers whose figures were made with other tables.")
    sort: Sort = "asset_tag"
    descending: bool = False

    def conditions(self) -> list[sa.ColumnElement[bool]]:
        """The conditions of the query."""
        c = lasers.c
        found: list[sa.ColumnElement[bool]] = [
            c.searchable.contains(word, autoescape=True) for word in self.q.lower().split()[:10]
        ]
        for name in ("asset_tag", "hazard_class", "place", "owner"):
            if value := getattr(self, name):
                found.append(c[name] == value)
        if self.rules:
            found.append(c.rules_id == self.rules)
        if self.status == "current":
            found.append(c.status != "retired")
        elif self.status:
            found.append(c.status == self.status)
        if self.overdue:
            found.append(sa.and_(c.review_due < today(), c.status != "retired"))
        if self.due_before:
            found.append(c.review_due < self.due_before)
        if self.stale:
            found.append(stale())
        return found

    def order(self) -> tuple[sa.ColumnElement[Any], ...]:
        """The order of the query; the id decides between equals."""
        key = SORTS[self.sort]
        return (key.desc(), lasers.c.id.desc()) if self.descending else (key, lasers.c.id)


def stale() -> sa.ColumnElement[bool]:
    """Condition: the figures of a laser in use were made with other tables, or another service."""
    current = [tables_digest(key) for key in rule_sets()]
    return sa.and_(lasers.c.tables_digest.not_in(current), lasers.c.status != "retired")


def page_of(connection: sa.Connection, filters: Filters, limit: int, cursor: str | None) -> LaserPage:
    """One page of a list. Raises InvalidRequest for a cursor of another list."""
    key = SORTS[filters.sort]
    conditions = filters.conditions()
    total = connection.execute(sa.select(sa.func.count()).select_from(lasers).where(*conditions)).scalar_one()
    query = sa.select(lasers, key.label("sort_key")).where(*conditions)
    if cursor:
        value, last = _read(cursor, filters)
        after = sa.tuple_(key, lasers.c.id)
        bound = sa.tuple_(sa.literal(value, key.type), sa.literal(last))
        query = query.where(after < bound if filters.descending else after > bound)
    rows = connection.execute(query.order_by(*filters.order()).limit(limit + 1)).mappings().all()
    more = len(rows) > limit
    rows = rows[:limit]
    following = _write(rows[-1]["sort_key"], rows[-1]["id"], filters) if more else None
    return LaserPage(items=[summary(dict(r)) for r in rows], next=following, total=total)


def _mark(filters: Filters) -> str:
    return f"{filters.sort}{'-' if filters.descending else '+'}"


def _write(value: Any, last: int, filters: Filters) -> str:
    text = json.dumps([_mark(filters), value, last], separators=(",", ":"))
    return base64.urlsafe_b64encode(text.encode()).decode().rstrip("=")


def _storable(value: Any) -> bool:
    """Whether a database can hold a value: whole characters without NUL, finite numbers."""
    if isinstance(value, str):
        return "\0" not in value and value.encode(errors="replace").decode() == value
    return bool(abs(value) < 1e308)


def _read(cursor: str, filters: Filters) -> tuple[Any, int]:
    try:
        text = base64.b64decode(cursor + "=" * (-len(cursor) % 4), altchars=b"-_", validate=True).decode()
        mark, value, last = json.loads(text)
        kind = str if SORTS[filters.sort].type.python_type is str else (int, float)
        fits = isinstance(value, kind) and type(last) is int and 0 <= last <= MOST
        if mark != _mark(filters) or not fits or not _storable(value):
            raise ValueError
    except (ValueError, TypeError, binascii.Error):
        error = field_error(
            "cursor",
            cursor,
            "the field next of the page before, under the same order",
            "this cursor does not belong to this list",
            "Start again without a cursor.",
        )
        raise InvalidRequest("cursor: it does not belong to this list", [error]) from None
    return value, last


def overview(connection: sa.Connection) -> dict[str, Any]:
    """Counts of the lasers in use: by class, by status, overdue, due soon, with other tables."""

    def counted(column: sa.ColumnElement[Any], *conditions: sa.ColumnElement[bool]) -> dict[str, int]:
        query = sa.select(column, sa.func.count()).where(*conditions).group_by(column)
        return {str(k): int(n) for k, n in connection.execute(query)}

    def number(*conditions: sa.ColumnElement[bool]) -> int:
        query = sa.select(sa.func.count()).select_from(lasers).where(*conditions)
        return int(connection.execute(query).scalar_one())

    in_use = lasers.c.status != "retired"
    return {
        "by_class": counted(lasers.c.hazard_class, in_use),
        "by_status": counted(lasers.c.status),
        "in_use": number(in_use),
        "overdue": number(in_use, lasers.c.review_due < today()),
        "no_review": number(in_use, lasers.c.review_due.is_(None)),
        "stale": number(stale()),
        "unbounded": number(in_use, lasers.c.eye_distance_m.is_(None)),
    }
