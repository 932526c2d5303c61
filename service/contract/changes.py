"""Changes that can move a result, and the digest of everything a result rests on.

`data/changes.toml` has them, newest first. Its newest entry for each table names the digest that the table
has now, so that no table can change without an entry.
"""

from __future__ import annotations

from datetime import date
from functools import cache
from pathlib import Path

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.files import DATA
from service.rules.tables import TableError, digest_of, read_toml

__all__ = ["Change", "change_list", "current_digests", "unrecorded"]


class Change(BaseModel):
    """One change."""

    model_config = ConfigDict(extra="forbid", strict=True)

    day: date
    version: str
    what: str = Field(description="What changed.")
    effect: str = Field(description="Which results move, and which way.")
    why: str
    digests: dict[str, str] = Field(description="Digest of each table that changed, from this change on.")


@cache
def change_list(path: Path = DATA / "changes.toml") -> list[Change]:
    """All changes, newest first. Raises TableError where the file cannot be used."""
    try:
        found = [Change.model_validate(entry) for entry in read_toml(path)["change"]]
    except (KeyError, ValidationError) as error:
        raise TableError(path, 1, str(error)) from None
    if [c.day for c in found] != sorted((c.day for c in found), reverse=True):
        raise TableError(path, 1, "the newest change must stand first")
    return found


def current_digests(data: Path = DATA) -> dict[str, str]:
    """Digest of every rule set, classification scheme and further table that results rest on, by name."""
    digests = {f"rules/{key}": compiled.rules.digest for key, compiled in rule_sets().items()}
    digests |= {f"classes/{key}": compiled.scheme.digest for key, compiled in schemes().items()}
    digests["eyewear"] = digest_of(sorted((data / "eyewear").glob("*.csv")))
    for path in sorted([*data.glob("*.csv"), data / "measures.toml"]):
        digests[path.name] = digest_of([path])
    return digests


def unrecorded() -> dict[str, str]:
    """Tables whose digest is not the one that the newest entry about them names, with the digest now."""
    recorded: dict[str, str] = {}
    for change in change_list():
        for name, digest in change.digests.items():
            recorded.setdefault(name, digest)
    return {name: now for name, now in current_digests().items() if recorded.get(name) != now}
