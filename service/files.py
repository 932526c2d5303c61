"""Where the tables and templates lie: inside an installed wheel, or beside the source."""

from __future__ import annotations

import os
import sys
from pathlib import Path

__all__ = ["DATA", "STATIC", "TEMPLATES"]

HERE = Path(__file__).resolve().parent
SHIPPED = HERE / "shipped"
ROOT = SHIPPED if SHIPPED.is_dir() else HERE.parent

DATA = ROOT / "data"
TEMPLATES = ROOT / "templates"
STATIC = HERE / "static"

for folder in (DATA, TEMPLATES, STATIC):
    if not os.access(folder, os.R_OK | os.X_OK):
        print(f"blinkline: the folder {folder} is missing or cannot be read; install again", file=sys.stderr)
        raise SystemExit(2)
