"""Sheets: how many signs and labels fit, where they lie, what is refused."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.contract.problem import InvalidRequest
from service.sign.layout import capacity, sheet_of
from service.sign.request import SignOptions


def options(**given: Any) -> SignOptions:
    return SignOptions.model_validate(given)


def test_one_two_and_four_signs_share_the_paper() -> None:
    assert sheet_of(options()).sign == (210, 297)
    assert sheet_of(options(orientation="landscape")).sign == (297, 210)
    assert sheet_of(options(copies=2)).sign == (210, 148.5)
    assert sheet_of(options(copies=2, orientation="landscape")).sign == (148.5, 210)
    four = sheet_of(options(copies=4))
    assert four.corners == ((0, 0), (105, 0), (0, 148.5), (105, 148.5))


@pytest.mark.parametrize(
    ("sheet", "label", "most"),
    [
        # By hand: A4 leaves 200 x 287 mm inside 5 mm edges; labels lie 4 mm apart.
        ("A4", [100, 50], 5),  # one column (2 x 100 + 4 > 200), 5 rows (5 x 50 + 4 x 4 = 266)
        ("A4", [98, 50], 10),
        ("A4", [74, 37], 14),  # 2 columns, 7 rows (7 x 37 + 6 x 4 = 283)
        ("A6", [74, 37], 3),
        ("own", [74, 37], 1),
    ],
)
def test_capacity(sheet: str, label: list[float], most: int) -> None:
    asked = options(kind="label", sheet=sheet, label_mm=label)
    assert capacity(asked) == most
    full = sheet_of(asked.model_copy(update={"copies": most}))
    assert len(full.corners) == most
    with pytest.raises(InvalidRequest) as caught:
        sheet_of(asked.model_copy(update={"copies": most + 1}))
    assert caught.value.errors[0].field == "sign.copies"
    assert str(most) in caught.value.errors[0].message


@given(
    st.sampled_from(["A3", "A4", "A5", "A6", "Letter"]),
    st.sampled_from(["portrait", "landscape"]),
    st.floats(20, 200),
    st.floats(10, 150),
)
def test_labels_never_overlap_nor_leave_the_paper(
    sheet: str, orientation: str, width: float, height: float
) -> None:
    asked = options(kind="label", sheet=sheet, orientation=orientation, label_mm=[width, height])
    most = capacity(asked)
    if most == 0:
        with pytest.raises(InvalidRequest, match="label_mm"):
            sheet_of(asked)
        return
    full = sheet_of(asked.model_copy(update={"copies": min(most, 200)}))
    for k, (x, y) in enumerate(full.corners):
        assert x >= 5
        assert y >= 5
        assert x + width <= full.page[0] - 5 + 1e-9
        assert y + height <= full.page[1] - 5 + 1e-9
        for other_x, other_y in full.corners[:k]:
            assert abs(x - other_x) >= width or abs(y - other_y) >= height


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"copies": 3}, "sign.copies"),
        ({"sheet": "own"}, "sign.sheet"),
        ({"label_mm": [100, 50]}, "sign.label_mm"),
        ({"kind": "label", "label_mm": [12, 11]}, "sign.label_mm"),
        ({"kind": "label", "label_mm": [297, 290], "sheet": "A3"}, "sign.label_mm"),
    ],
)
def test_what_a_sheet_cannot_hold_is_refused(given: dict[str, Any], field: str) -> None:
    with pytest.raises(InvalidRequest) as caught:
        sheet_of(options(**given))
    assert caught.value.errors[0].field == field
