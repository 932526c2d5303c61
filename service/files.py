"""Where the tables and templates lie: inside an installed wheel, or beside the source."""

from __future__ import annotations

from pathlib import Path

__all__ = ["DATA", "STATIC", "TEMPLATES"]

HERE = Path(__file__).resolve().parent
SHIPPED = HERE / "shipped"
ROOT = SHIPPED if SHIPPED.is_dir() else HERE.parent

DATA = ROOT / "data"
TEMPLATES = ROOT / "templates"
STATIC = HERE / "static"
