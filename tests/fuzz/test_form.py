"""Whatever is typed into the form or put into its address: a page, never a failure."""

from __future__ import annotations

from urllib.parse import quote, urlencode

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.web.client import Client
from tests.web.markup import parse
from tests.web.pages import CW, HTML

EXAMPLES = settings(
    max_examples=60,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)
#: Numbers at the ends of what doubles and people can write, and what is no number at all.
ENDS = "|0|-0|1e308|1e309|5e-324|1e-400|nan|inf|1,064|1064,5|1.064 µm|１２|٣|0x10|1_000|1e|+|−1| 5 |1/2|\x00"
TYPED = st.one_of(st.sampled_from([*ENDS.split("|"), "9" * 60]), st.floats().map(repr), st.text(max_size=40))
MORE = "rules energy_j-1 pulse_s-1 rate_hz-1 average_power_w-1 waist_m-1 diameter_y_mm-1 profile-1"
FIELDS = st.sampled_from(
    [*CW, *MORE.split(), "level-1", "distance_m", "pairs", "windows", "add", "v", "edit"]
)


def sound(client: Client, query: str) -> None:
    for _ in range(2):
        response = client.get(f"/evaluate?{query}", headers=HTML)
        assert response.status_code in (200, 303, 400, 404, 422), (response.status_code, query)
        if response.status_code != 303:
            parse(response.text)
            return
        query = response.headers["location"].partition("?")[2]


@EXAMPLES
@given(changes=st.dictionaries(FIELDS, TYPED, min_size=1, max_size=4))
def test_changed_fields(client: Client, changes: dict[str, str]) -> None:
    text = urlencode({"v": "1", **CW, **changes}, quote_via=quote, errors="replace")
    sound(client, text)


@EXAMPLES
@given(query=st.text(alphabet=st.characters(codec="ascii", exclude_characters="#"), max_size=80))
def test_any_address(client: Client, query: str) -> None:
    sound(client, quote(query, safe="=&%+;-"))
