"""Whatever stands in the fields of the form: an answer, or an error at a field that exists."""

from __future__ import annotations

from urllib.parse import urlencode

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from service.web.fields import ELEMENTS, FIELDS, PARTS, TOP, field_name
from service.web.units import FAMILIES
from tests.web.client import Client
from tests.web.markup import parse
from tests.web.pages import CW, HTML

EXAMPLES = settings(
    max_examples=80,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
NUMBERS = st.one_of(
    st.sampled_from(
        ["0", "-1", "1e-30", "1e30", "1,5", "1,064", "0.5", "2", "10", "45", "100", "500", "1064", "x"]
    ),
    st.floats(1e-12, 1e6).map(repr),
)


@st.composite
def forms(draw: st.DrawFn) -> dict[str, str]:
    """A form that a browser can send: fields that stand on it, units and choices that it offers."""
    fields = dict(CW)
    kinds = draw(st.lists(st.sampled_from(list(ELEMENTS)), max_size=3))
    if kinds:
        fields["elements"] = str(len(kinds))
    names = [*TOP, *(field_name(n, 1) for n in PARTS["lines"].fields)]
    for k, kind in enumerate(kinds, start=1):
        fields[field_name("bench_kind", k)] = kind
        names += [field_name(n, k) for n in ELEMENTS[kind][1]]
    for name in draw(st.lists(st.sampled_from(names), max_size=8, unique=True)):
        spec = FIELDS[name.rpartition("-")[0] or name] if name not in FIELDS else FIELDS[name]
        if name == "look":
            fields[name] = draw(st.sampled_from(["usual", "other", "2", "0.25", "30000"]))
        elif spec.choices:
            fields[name] = draw(st.sampled_from([value for value, _ in spec.choices]))
        elif spec.number:
            fields[name] = draw(NUMBERS)
            fields[f"{name}.in"] = draw(st.sampled_from([u.key for u in FAMILIES[spec.family]]))
        elif name == "rules":
            fields[name] = draw(st.sampled_from(["icnirp-2013", "eu-2006-25", "none"]))
        else:
            fields[name] = draw(st.text(max_size=20))
    return fields


#: What each element needs, and fields that fit a continuous Gaussian beam.
NEEDED = {
    "space": {"bench_length_m": "0.5"},
    "lens": {"bench_focal_mm": "100"},
    "mirror": {"bench_radius_mm": "200"},
    "expander": {"bench_magnification": "2"},
    "window": {"bench_transmittance": "0.9"},
    "reflector": {"bench_reflectance": "0.5"},
    "diffuser": {"bench_reflectance": "0.8"},
    "scanner": {"bench_angle_deg": "30", "bench_sweeps_hz": "100"},
}
FITTING = (
    "distance_m",
    "visibility_km",
    "outdoors",
    "diameter_y_mm-1",
    "waist_m-1",
    "subtense_mrad-1",
    "level-1",
)


@st.composite
def good_forms(draw: st.DrawFn) -> dict[str, str]:
    """A form that must be answered."""
    fields = {
        **CW,
        "wavelength_nm-1": draw(st.sampled_from(["220", "355", "450", "532", "1064", "1550", "10600"])),
    }
    kinds = draw(st.lists(st.sampled_from(list(NEEDED)[:6]), max_size=3))
    kinds += draw(st.lists(st.sampled_from(["diffuser", "scanner"]), max_size=1))
    if kinds:
        fields["elements"] = str(len(kinds))
    for k, kind in enumerate(kinds, start=1):
        fields |= {field_name(n, k): v for n, v in {"bench_kind": kind, **NEEDED[kind]}.items()}
    for name in draw(st.lists(st.sampled_from(FITTING), max_size=3, unique=True)):
        spec = FIELDS[name.removesuffix("-1")]
        numbers = st.floats(0.1, 5).map(lambda x: f"{x:.3g}")
        fields[name] = draw(numbers) if spec.number else spec.choices[-1][0]
    return fields


@settings(EXAMPLES, max_examples=8)
@given(good_forms())
def test_every_good_form_is_answered(client: Client, fields: dict[str, str]) -> None:
    url = f"/evaluate?{urlencode({'v': '1', **fields})}"
    response = client.get(url, headers=HTML, follow_redirects=True)
    assert response.status_code == 200, parse(response.text).one("section", role="alert").text
    root = parse(response.text)
    assert len(set(root.ids)) == len(root.ids)
    targets = [a.attributes["href"] for a in root.all("a") if a.attributes["href"].startswith("#")]
    assert all(t[1:] in root.ids for t in targets), targets
    assert len(root.by_id("side-by-side").one("tbody").all("tr")) == 4


@EXAMPLES
@given(forms())
def test_every_form_is_answered_or_refused_at_a_field(client: Client, fields: dict[str, str]) -> None:
    query = urlencode({"v": "1", **fields})
    response = client.get(f"/evaluate?{query}", headers=HTML, follow_redirects=True)
    assert response.status_code in (200, 422), response.text[:300]
    root = parse(response.text)
    assert len(set(root.ids)) == len(root.ids)
    if response.status_code == 422:
        links = [a.attributes["href"].removeprefix("#") for a in root.one("section", role="alert").all("a")]
        assert links
        assert set(links) <= set(root.ids), set(links) - set(root.ids)
    else:
        targets = [a.attributes["href"] for a in root.all("a") if a.attributes["href"].startswith("#")]
        assert all(t[1:] in root.ids for t in targets), targets
    live = client.get(f"/live?{query}").json()
    assert live["answered"] == (response.status_code == 200)
