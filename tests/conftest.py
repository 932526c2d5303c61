"""No test touches the register of the person who runs it."""

from __future__ import annotations

import atexit
import os
import shutil
import tempfile

#: Also for the processes that tests start.
os.environ["XDG_DATA_HOME"] = tempfile.mkdtemp(prefix="blinkline-tests-")
atexit.register(shutil.rmtree, os.environ["XDG_DATA_HOME"], ignore_errors=True)
