"""Camera images and tables of numbers to arrays: strict, and limited in size before anything is unpacked."""

from __future__ import annotations

import base64
import binascii
import io
import re
import warnings

import numpy as np
from numpy.typing import NDArray
from PIL import Image, UnidentifiedImageError

__all__ = ["FORMATS", "MAX_PIXELS", "BadPicture", "pixels_of"]

MAX_PIXELS = 8_000_000
FORMATS = {"png": "PNG", "tiff": "TIFF"}
#: Greyscale of 8, 16 or 32 bits and floating point.
GREY = ("L", "I", "F", "I;16", "I;16L", "I;16B", "I;16N")


class BadPicture(ValueError):
    """The file is no image that can be used; the message says why."""


def pixels_of(text: str, kind: str) -> NDArray[np.float64]:
    """The pixels of an image (base64 of a PNG or TIFF, or CSV text), rows from the top. Raises BadPicture."""
    if kind == "csv":
        return _table(text)
    try:
        content = base64.b64decode(text, validate=True)
    except (binascii.Error, ValueError):
        raise BadPicture("the image is not base64") from None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error", Image.DecompressionBombWarning)
            picture = Image.open(io.BytesIO(content), formats=[FORMATS[kind]])
            width, height = picture.size
            if width * height > MAX_PIXELS:
                raise BadPicture(f"{width} x {height} pixels are more than {MAX_PIXELS}")
            if picture.mode not in GREY:
                raise BadPicture(f"the image has the colours {picture.mode}; save the camera's greyscale")
            values = np.asarray(picture, dtype=np.float64)
    except (
        UnidentifiedImageError,
        OSError,
        SyntaxError,
        ValueError,
        Image.DecompressionBombWarning,
    ) as error:
        if isinstance(error, BadPicture):
            raise
        raise BadPicture(f"this is no {FORMATS[kind]} image that can be read") from None
    return _checked(values)


def _table(text: str) -> NDArray[np.float64]:
    """Numbers in rows, parted by comma, semicolon, tab or blank."""
    rows: list[NDArray[np.float64]] = []
    count = 0
    for number, line in enumerate(text.splitlines(), start=1):
        if not line.strip():
            continue
        try:
            row = np.array([float(word) for word in re.split(r"[,;\s]+", line.strip(" \t,;"))])
        except ValueError:
            raise BadPicture(f"line {number} of the table holds something that is no number") from None
        if rows and len(row) != len(rows[0]):
            raise BadPicture(f"line {number} has {len(row)} numbers, the first {len(rows[0])}")
        rows.append(row)
        count += len(row)
        if count > MAX_PIXELS:
            raise BadPicture(f"the table has more than {MAX_PIXELS} numbers")
    if not rows:
        raise BadPicture("the table is empty")
    return _checked(np.array(rows))


def _checked(values: NDArray[np.float64]) -> NDArray[np.float64]:
    if values.ndim != 2 or min(values.shape) < 2:
        raise BadPicture("the image has fewer than 2 x 2 pixels")
    if not np.isfinite(values).all():
        raise BadPicture("the image holds values that are no numbers")
    return values
