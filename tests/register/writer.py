"""Stores lasers one after the other and tells of each once it is stored; run as a process to be killed."""

from __future__ import annotations

import sys

from service.register import lasers
from service.register.actor import Actor
from service.register.database import Database, database_url
from service.register.figures import kept
from service.register.models import LaserIn
from tests.register.web import laser


def main(address: str, count: int) -> None:
    database = Database(database_url(address, ""))
    body = LaserIn.model_validate(laser())
    found = kept(body.asked)
    actor = Actor("writer", "admin", "command")
    for n in range(count):
        new = body.model_copy(update={"asset_tag": f"W-{n}"})
        with database.write() as connection:
            lasers.create(connection, actor, new, found)
        print(f"W-{n}", flush=True)


if __name__ == "__main__":
    main(sys.argv[1], int(sys.argv[2]))
