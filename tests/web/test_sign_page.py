"""The page of a sign: its form, one address for one sheet, errors beside fields, files."""

from __future__ import annotations

from urllib.parse import parse_qsl, quote, urlencode

import pytest

from service.app import create_app
from service.settings import Settings, SettingsError
from tests.web.client import Client
from tests.web.markup import Element, parse
from tests.web.pages import CW, HTML, address
from tests.web.shape import assert_problem
from tests.web.sign_pdf import codes

EVALUATION = address(CW).partition("?")[2]


def at(path: str = "/sign", **sign: str) -> str:
    """Address of a sign in canonical order where the caller keeps to it."""
    given = {f"sign-{name}": value for name, value in {"v": "1", **sign}.items()} if sign else {}
    return f"{path}?{EVALUATION}" + (f"&{urlencode(given, quote_via=quote)}" if given else "")


def opened(client: Client, url: str, status: int = 200) -> tuple[Element, str]:
    """The page after at most one redirect, and its address."""
    response = client.get(url, headers=HTML)
    if response.status_code == 303:
        url = response.headers["location"]
        response = client.get(url, headers=HTML)
    assert response.status_code == status, response.text[:300]
    return parse(response.text), url


def test_the_evaluation_leads_to_the_sign_and_back(client: Client) -> None:
    evaluation, url = opened(client, address(CW))
    links = [a.attributes["href"] for a in evaluation.all("a") if a.attributes["href"].startswith("/sign?")]
    assert len(links) == 1
    page, _ = opened(client, links[0])
    assert page.one("title").text == "Sign for Bench 4 alignment beam · Blinkline"
    back = [a.attributes["href"] for a in page.all("a") if a.attributes["href"].startswith("/evaluate")]
    assert back == [url]


def test_a_bare_address_redirects_to_the_one_with_its_date(client: Client) -> None:
    _, url = opened(client, at())
    own = [item for item in parse_qsl(url.partition("?")[2]) if item[0].startswith("sign-")]
    assert [name for name, _ in own] == ["sign-v", "sign-date"]
    assert client.get(url, headers=HTML).status_code == 200


def test_one_sheet_has_one_address(client: Client) -> None:
    _, url = opened(client, at(date="2026-12-01", family="ansi", sheet="A4", room=" Room 1 ", second="de"))
    assert url == at(family="ansi", second="de", room="Room 1", date="2026-12-01")


def test_the_page_works_without_script(client: Client) -> None:
    page, _ = opened(client, at(family="ansi", room="Room 1", date="2026-12-01"))
    form = page.by_id("sign-form")
    assert (form.attributes["action"], form.attributes["method"]) == ("/sign", "get")
    hidden = [(e.attributes["name"], e.attributes["value"]) for e in form.all("input", type="hidden")]
    assert hidden == [*parse_qsl(EVALUATION), ("sign-v", "1")]
    assert form.by_id("sign-room").attributes["value"] == "Room 1"
    chosen = [
        o.attributes["value"] for o in form.by_id("sign-family").all("option") if "selected" in o.attributes
    ]
    assert chosen == ["ansi"]
    assert len(form.all("button")) == 1
    # Every field has a label of its own.
    named = {e.attributes["for"] for e in form.all("label")}
    fields = [e for e in form.walk() if e.tag in ("select", "textarea") or e.attributes.get("type") == "text"]
    assert {e.attributes["id"] for e in fields} == named


def test_the_page_says_what_the_sign_says(client: Client) -> None:
    page, _ = opened(client, at(date="2026-12-01"))
    result = page.by_id("sign-result").text
    for text in ("CLASS 3B LASER PRODUCT", "532 nm: 100 mW, continuous", "eye: 99.8 m", "OD ≥ 2.1"):
        assert text in result.replace("\u00a0", " ")
    assert "no room was given" in result
    assert "A translation is not a legal text" in result
    assert "No conformity is claimed" in result


def test_files_of_the_page(client: Client) -> None:
    page, _ = opened(client, at(room="Room 1", date="2026-12-01"))
    links = [a.attributes["href"] for a in page.all("a") if a.attributes["href"].startswith("/sign/sheet.")]
    types = {}
    for link in links:
        response = client.get(link)
        types[link.partition("?")[0].rpartition(".")[2]] = response.headers["content-type"]
    assert types == {"pdf": "application/pdf", "svg": "image/svg+xml", "png": "image/png"}
    (image,) = page.by_id("sign-result").all("img")
    assert client.get(image.attributes["src"]).content.startswith(b"\x89PNG")
    assert client.get(at("/sign/sheet.docx")).status_code == 404


def test_the_print_view_holds_the_sheet_and_its_words(client: Client) -> None:
    response = client.get(at("/sign/print", room="Room 1", date="2026-12-01"), headers=HTML)
    page = parse(response.text)
    (image,) = page.all("img")
    assert client.get(image.attributes["src"]).headers["content-type"] == "image/svg+xml"
    assert "CLASS 3B LASER PRODUCT" in image.attributes["alt"]
    assert "Room: Room 1" in image.attributes["alt"]
    assert page.one("body").attributes["class"] == "A4-portrait"


def test_the_code_leads_to_the_evaluation(client: Client) -> None:
    picture = client.get(at("/sign/sheet.png", date="2026-12-01")).content
    (url,) = codes(picture)
    assert url == f"http://blinkline.test{address(CW)}"
    assert client.get(url, headers=HTML).status_code == 200


@pytest.mark.parametrize(
    ("sign", "fields"),
    [
        ({"kind": "temporary"}, ["sign-valid_from", "sign-valid_to"]),
        ({"copies": "three"}, ["sign-copies"]),
        ({"copies": "3"}, ["sign-copies"]),
        ({"kind": "label", "label_mm": "wide"}, ["sign-label_mm"]),
        ({"kind": "label", "label_mm": "90 x 45", "copies": "99"}, ["sign-copies"]),
        ({"second": "en"}, ["sign-second"]),
        ({"date": "tomorrow"}, ["sign-date"]),
        ({"room": "\u05e9"}, ["sign-room"]),
        ({"extra_lines": "\n".join("12345")}, ["sign-extra_lines"]),
        ({"sheet": "A6", "copies": "4", "extra_lines": "\n".join(["word " * 20] * 4)}, ["sign-sheet"]),
    ],
)
def test_errors_stand_at_their_fields(client: Client, sign: dict[str, str], fields: list[str]) -> None:
    page, _ = opened(client, at(**{"date": "2026-12-01", **sign}), 422)
    links = [a.attributes["href"] for a in page.by_id("sign-result").all("a")]
    assert links == [f"#{field}" for field in fields]
    for field in fields:
        assert page.by_id(field).attributes["aria-invalid"] == "true"
    assert page.by_id("sign-result").all("img") == []


@pytest.mark.parametrize(
    ("more", "field"),
    [
        ("&sign-v=2", "sign-v"),
        ("&sign-room=1", "sign-v"),
        ("&sign-v=1&sign-colour=red", "sign-colour"),
        ("&sign-v=1&sign-sheet=A2", "sign-sheet"),
        ("&sign-v=1&sign-room=1&sign-room=2", "sign-room"),
        ("&colour=red", "colour"),
    ],
)
def test_addresses_the_form_does_not_know_are_refused(client: Client, more: str, field: str) -> None:
    assert_problem(client.get(f"/sign?{EVALUATION}{more}"), 400, field)


def test_a_sign_needs_an_evaluation(client: Client) -> None:
    assert client.get("/sign", headers=HTML).status_code == 404
    assert client.get("/sign?sign-v=1&sign-sheet=A3", headers=HTML).status_code == 404
    bad = EVALUATION.replace("power_w-1=0.1", "power_w-1=-1")
    page, _ = opened(client, f"/sign?{bad}", 422)
    assert "mend them on its page" in page.by_id("sign-result").text


@pytest.mark.parametrize("text", ["<script>alert(1)</script>", '"><img src=x>', "{{ 7*7 }}"])
def test_hostile_text_stays_text(client: Client, text: str) -> None:
    page, _ = opened(client, at(room=text, extra_lines=text, date="2026-12-01"))
    assert page.by_id("sign-room").attributes["value"] == text
    assert page.by_id("sign-extra_lines").text == text
    assert text in page.by_id("sign-result").text


def test_settings_of_the_site() -> None:
    given = {
        "BLINKLINE_SIGN_POLICY": "strict",
        "BLINKLINE_LSO_NAME": "A. Example",
        "BLINKLINE_LSO_PHONE": "+00 1",
        "BLINKLINE_PUBLIC_ADDRESS": "https://laser.example/blinkline",
    }
    settings = Settings.from_environment(given)
    assert (settings.sign_policy, settings.lso_name, settings.lso_phone) == ("strict", "A. Example", "+00 1")
    for name, value in (
        ("BLINKLINE_SIGN_POLICY", "lax"),
        ("BLINKLINE_PUBLIC_ADDRESS", "laser.example"),
        ("BLINKLINE_PUBLIC_ADDRESS", "https://laser.example/"),
        ("BLINKLINE_LSO_NAME", "x" * 81),
        ("BLINKLINE_LSO_PHONE", "1\n2"),
    ):
        with pytest.raises(SettingsError, match=name):
            Settings.from_environment({name: value})
    assert create_app(settings).state.settings.lso_phone == "+00 1"
