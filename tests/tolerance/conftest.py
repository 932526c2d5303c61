"""The client of this folder."""

from tests.web.client import client

__all__ = ["client"]
