"""The revision of a laser that is in force: what a sign or a report of the laser is made from."""

from __future__ import annotations

from dataclasses import dataclass

import sqlalchemy as sa

from service.contract.request import EvaluationRequest
from service.register.difference import figures_changed
from service.register.figures import kept, request_from
from service.register.models import Figures
from service.register.problems import Conflict
from service.register.schema import decisions
from service.register.stored import laser_row, revision_row

__all__ = ["InForce", "check_holds", "in_force"]


@dataclass(frozen=True, slots=True)
class InForce:
    """A revision: the approved one (`approved_by`, `approved_on` say by whom and when), else the newest."""

    laser_id: int
    asset_tag: str
    place: str
    owner: str
    number: int
    made_on: str
    request: EvaluationRequest
    figures: Figures
    approved_by: str
    approved_on: str

    @property
    def approved(self) -> bool:
        """Whether it is in force; otherwise nothing of this laser is."""
        return bool(self.approved_on)

    @property
    def standing(self) -> str:
        """Which revision it is and whether it was approved, in words."""
        if self.approved:
            return (
                f"{self.asset_tag}, revision {self.number}, approved {self.approved_on} by {self.approved_by}"
            )
        return f"Not approved ({self.asset_tag}, revision {self.number})"


def in_force(connection: sa.Connection, laser_id: int) -> InForce:
    """The revision in force, else the newest. Raises NotFound; Conflict where the laser is retired."""
    row = laser_row(connection, laser_id)
    if row["status"] == "retired":
        raise Conflict(f"laser {row['asset_tag']!r} is retired: nothing of it is in force")
    approved = row["approved_revision"]
    revision = revision_row(connection, laser_id, approved or row["revision"])
    by, on = "", ""
    if approved:
        query = sa.select(decisions).where(
            decisions.c.revision_id == revision["id"], decisions.c.action == "approved"
        )
        decision = connection.execute(query.order_by(decisions.c.id.desc())).mappings().first()
        assert decision is not None
        by, on = decision["by"], decision["at"][:10]
    return InForce(
        laser_id=laser_id,
        **{name: row[name] for name in ("asset_tag", "place", "owner")},
        number=revision["number"],
        made_on=revision["created_at"][:10],
        request=request_from(revision["request"]),
        figures=Figures.model_validate_json(revision["figures"]),
        approved_by=by,
        approved_on=on,
    )


def check_holds(found: InForce) -> None:
    """Raises Conflict where the tables in use give another class, distance or density than the revision has.

    A sign would otherwise show figures that nobody approved.
    """
    if figures_changed(found.figures, kept(found.request).figures):
        raise Conflict(
            f"under the tables in use class, distance or density of {found.asset_tag!r} are no longer "
            f"those of revision {found.number}; evaluate it anew and have it approved first"
        )
