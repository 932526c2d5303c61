"""Reading a sign back from its PDF: words, and the box of every letter's ink."""

from __future__ import annotations

import io
import re
from dataclasses import dataclass

import numpy as np
import pypdfium2
import pypdfium2.raw as raw
import zxingcpp
from PIL import Image

__all__ = ["CAPITAL", "MM", "Read", "assert_set_well", "codes", "read"]

#: Points in a millimetre.
MM = 72.0 / 25.4
#: Height of capitals of the font per letter size: 660 of 1000 units in its OS/2 table.
CAPITAL = 0.66


@dataclass
class Read:
    """A PDF's pages and the first one's size [pt], text with single blanks, ink boxes and letter sizes.

    `boxes` are left, top, right, bottom [pt] from the left upper corner, one row per letter.
    """

    pages: int
    size: tuple[float, float]
    text: str
    letters: str
    boxes: np.ndarray
    sizes: np.ndarray


def read(document: bytes) -> Read:
    """Read a PDF back."""
    with pypdfium2.PdfDocument(document) as opened:
        page = opened[0]
        width, height = page.get_size()
        found = page.get_textpage()
        everything, letters, boxes, sizes = [], [], [], []
        for k in range(found.count_chars()):
            character = chr(raw.FPDFText_GetUnicode(found, k))
            everything.append(character)
            if raw.FPDFText_IsGenerated(found, k) or not character.strip("\u00a0 "):
                continue
            left, bottom, right, top = found.get_charbox(k)
            letters.append(character)
            boxes.append((left, height - top, right, height - bottom))
            sizes.append(raw.FPDFText_GetFontSize(found, k))
        text = re.sub(r"\s+", " ", "".join(everything).replace("\u00a0", " "))
        count = len(opened)
    return Read(count, (width, height), text, "".join(letters), np.array(boxes), np.array(sizes))


def codes(picture: bytes) -> list[str]:
    """Texts of the codes in a PNG, read as a camera would."""
    opened = Image.open(io.BytesIO(picture)).convert("L")
    return [found.text for found in zxingcpp.read_barcodes(opened)]


def assert_set_well(
    found: Read, corner: tuple[float, float], sign: tuple[float, float], least_mm: float
) -> int:
    """One page; every letter of the sign inside its edge, large enough, and on no other. Lengths in mm.

    Returns the number of letters on this sign.
    """
    assert found.pages == 1
    left, top = (c * MM for c in corner)
    right, bottom = left + sign[0] * MM, top + sign[1] * MM
    middle = (found.boxes[:, :2] + found.boxes[:, 2:]) / 2.0
    own = ((middle > (left, top)) & (middle < (right, bottom))).all(axis=1)
    boxes, sizes = found.boxes[own], found.sizes[own]
    assert len(boxes) > 10
    assert (sizes * CAPITAL >= least_mm * MM - 0.01).all(), sizes.min()
    assert (boxes[:, :2] > (left, top)).all()
    assert (boxes[:, 2:] < (right, bottom)).all()
    # Neighbours in a line may lean into each other (AV); letters of different lines and columns may not.
    across = np.minimum(boxes[:, None, 2], boxes[None, :, 2]) - np.maximum(
        boxes[:, None, 0], boxes[None, :, 0]
    )
    along = np.minimum(boxes[:, None, 3], boxes[None, :, 3]) - np.maximum(
        boxes[:, None, 1], boxes[None, :, 1]
    )
    size = np.maximum(sizes[:, None], sizes[None, :])
    meet = (across > 0.13 * size) & (along > 0.02 * size)
    # A ligature is one glyph that stands for two letters: they share their box.
    meet &= (boxes[:, None] != boxes[None, :]).any(axis=2)
    letters = np.array(list(found.letters))[own]
    assert not meet.any(), [(letters[a], letters[b]) for a, b in np.argwhere(meet)[:5]]
    return len(boxes)
