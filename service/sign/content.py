"""What a sign says: every word and figure of it, made from the answer of an evaluation.

Rules for what is missing. Refused: a temporary area without its days, a size or a number of copies the sheet
cannot hold, a signal word weaker than the class takes. Left out, and said so: room, name, telephone, address,
laser label. Nothing is printed empty.
"""

from __future__ import annotations

import unicodedata
from dataclasses import dataclass
from datetime import date

from pydantic import Field

from service.contract.classification import HazardClass
from service.contract.evaluation import EvaluationResult
from service.contract.problem import FieldError, InvalidRequest
from service.contract.result import Model
from service.sign.request import SignOptions
from service.sign.rows import (
    Figure,
    Row,
    Speech,
    beyond_every_filter,
    distances,
    eyewear,
    needs_eyewear,
    outputs,
)
from service.sign.tables import ClassWords, SignTables, sign_tables

__all__ = ["Headline", "LeftOut", "SignContent", "SiteDefaults", "edition", "refuse", "sign_content"]

#: What only signs for the door carry.
DOOR_ONLY = ("room", "lso_name", "lso_phone", "whole_room", "address")


@dataclass(frozen=True, slots=True)
class SiteDefaults:
    """What the site has settled: `policy` of signal words, name and telephone of its LSO."""

    policy: str = "standard"
    lso_name: str = ""
    lso_phone: str = ""


class Headline(Model):
    """The warning in one language: radiation, class sentence (null: the class has none), class."""

    language: str
    radiation: str
    sentence: str | None
    hazard_class: str


class Spoken(Model):
    """Sentences in one language."""

    language: str
    texts: list[str]


class LeftOut(Model):
    """Something that the sign does not carry, and why."""

    field: str
    reason: str


class SignContent(Model):
    """Everything that the sign says. `figures` names the value of the answer behind each printed figure."""

    title: str
    family: str
    kind: str
    languages: list[str]
    scheme: str
    hazard_class: str
    signal_word: str | None = Field(description="Family ansi; null for iso.")
    signal_texts: list[str]
    symbol: bool
    banner: list[str] = Field(description="Above the headline: the name of a temporary controlled area.")
    headlines: list[Headline]
    notes: list[Spoken]
    rows: list[Row]
    footer: list[str]
    address: str | None
    date: str
    figures: list[Figure]
    left_out: list[LeftOut]
    checks: list[str] = Field(description="Who should check the words of each language.")


def refuse(field: str, value: object, allowed: str, message: str, remedy: str) -> InvalidRequest:
    """The problem for a field of the sign."""
    name = f"sign.{field}"
    error = FieldError(field=name, value=value, allowed=allowed, message=message, remedy=remedy)
    return InvalidRequest(f"{name}: {message}", [error])


def sign_content(
    result: EvaluationResult, options: SignOptions, site: SiteDefaults, today: date
) -> SignContent:
    """The content of a sign. Raises InvalidRequest where a rule refuses it."""
    tables = sign_tables()
    if len(set(options.languages)) != len(options.languages):
        raise refuse(
            "languages",
            ", ".join(options.languages),
            "two different languages",
            "a language stands twice",
            "Name one language, or two different ones.",
        )
    _check_days(options)
    found = _class_of(result, options)
    words = tables.class_words(found.scheme, found.hazard_class)
    speech = Speech([tables.phrases[key] for key in options.languages])
    signal = _signal(options, words, site, tables)
    label = _label(result)
    left_out: list[LeftOut] = []
    door = options.kind in ("area", "temporary")
    figures: list[Figure] = []
    rows = _door_rows(result, options, site, speech, figures, left_out) if door else []
    if not door:
        given = {n: getattr(options, n) for n in DOOR_ONLY}
        reason = "labels do not carry it"
        left_out += [LeftOut(field=f"sign.{n}", reason=f"{n}: {reason}") for n, v in given.items() if v]
    if options.kind == "label":
        rows = [outputs(result, speech, figures)]
    title = " / ".join(speech.each("class", found.hazard_class))
    day = options.date or today.isoformat()
    return SignContent(
        title=f"{title} – {label}" if label else title,
        family=options.family,
        kind=options.kind,
        languages=list(options.languages),
        scheme=found.scheme,
        hazard_class=found.hazard_class,
        signal_word=signal,
        signal_texts=[] if signal is None else speech.distinct("signal", signal),
        symbol=words.symbol and options.kind != "aperture",
        banner=speech.each("temporary") if options.kind == "temporary" else [],
        headlines=_headlines(result, options, found, words, tables),
        notes=_notes(result, words, options, tables) if door else [],
        rows=[*rows, *_extra(options)],
        footer=_footer(result, found, options, speech, day),
        address=options.address if door else None,
        date=day,
        figures=figures,
        left_out=left_out,
        checks=[f"{p.name}: {p.check}" for p in speech.phrases],
    )


def _check_days(options: SignOptions) -> None:
    """A temporary area has both its days, in order; another sign has none."""
    temporary = options.kind == "temporary"
    problems = []
    for name, day in (("valid_from", options.valid_from), ("valid_to", options.valid_to)):
        if temporary and day is None:
            remedy = "Give the first and the last day of the temporary controlled area."
            problems.append(
                refuse(name, None, "a date, YYYY-MM-DD", "a temporary area needs its days", remedy)
            )
        if not temporary and day is not None:
            remedy = "Leave it out, or ask for kind temporary."
            problems.append(refuse(name, day, "no value", "only a temporary area has days", remedy))
    if problems:
        raise InvalidRequest(problems[0].detail, [e for p in problems for e in p.errors])
    if options.valid_from and options.valid_to and options.valid_to < options.valid_from:
        allowed = f"{options.valid_from} or later"
        message = "the last day lies before the first"
        raise refuse("valid_to", options.valid_to, allowed, message, "Swap the days.")


def _class_of(result: EvaluationResult, options: SignOptions) -> HazardClass:
    found = {c.scheme: c for c in result.classification}
    if options.scheme not in found:
        allowed = ", ".join(found)
        raise refuse("scheme", options.scheme, allowed, "unknown scheme", "Choose one of the schemes listed.")
    return found[options.scheme]


def _signal(options: SignOptions, words: ClassWords, site: SiteDefaults, tables: SignTables) -> str | None:
    """The signal word: the class's own, DANGER where the site asks for it, or a stronger one asked for."""
    wanted = options.signal_word
    if options.family == "iso" or options.kind == "aperture":
        if wanted != "auto":
            remedy = "Leave it out, or ask for family ansi and another kind."
            raise refuse("signal_word", wanted, "auto", "this sign carries no signal word", remedy)
        return None
    order = tables.words.order.words
    own = "danger" if words.level in tables.words.policy[site.policy].danger else words.word
    if options.kind == "temporary":
        # The sign of a temporary controlled area is a NOTICE, whatever the class inside.
        own = "notice"
    if wanted == "auto":
        return own
    if order.index(wanted) > order.index(own):
        allowed = ", ".join(order[: order.index(own) + 1])
        message = f"weaker than {own.upper()}, which the class takes at this site"
        raise refuse("signal_word", wanted, allowed, message, "Choose a stronger word, or auto.")
    return wanted


def _headlines(
    result: EvaluationResult,
    options: SignOptions,
    found: HazardClass,
    words: ClassWords,
    tables: SignTables,
) -> list[Headline]:
    low, high = tables.words.visible[found.scheme]
    visible = {low <= line["wavelength_nm"] < high for line in result.inputs["lines"]}
    seen = "both" if len(visible) == 2 else "visible" if visible == {True} else "invisible"
    headlines = []
    for key in options.languages:
        phrases = tables.phrases[key]
        sentence = phrases.sentence.get(words.level)
        radiation = phrases.radiation[seen]
        if options.kind == "aperture":
            strong = words.level in ("3R", "3B", "4")
            radiation = phrases.words["aperture"]
            sentence = phrases.words["aperture_avoid"] if strong else None
        headlines.append(
            Headline(
                language=key,
                radiation=radiation,
                sentence=sentence,
                hazard_class=phrases.words["class"].format(found.hazard_class),
            )
        )
    return headlines


def _notes(
    result: EvaluationResult, words: ClassWords, options: SignOptions, tables: SignTables
) -> list[Spoken]:
    wear = needs_eyewear(result) and not beyond_every_filter(result)
    keys = (["controlled"] if words.controlled else []) + (["wear"] if wear else [])
    keys.append("ask_entering" if words.controlled else "ask")
    return [
        Spoken(language=language, texts=[tables.phrases[language].words[key] for key in keys])
        for language in options.languages
    ]


def _door_rows(
    result: EvaluationResult,
    options: SignOptions,
    site: SiteDefaults,
    speech: Speech,
    figures: list[Figure],
    left_out: list[LeftOut],
) -> list[Row]:
    """The rows of a sign for the door; what is missing is left out and told."""
    rows: list[Row | None] = []
    label = _label(result)
    officer = " · ".join(
        t
        for t in (
            site.lso_name if options.lso_name is None else options.lso_name,
            site.lso_phone if options.lso_phone is None else options.lso_phone,
        )
        if t
    )
    if options.kind == "temporary":
        days = [speech.joined("valid_from_to", options.valid_from, options.valid_to)]
        rows.append(Row(id="valid", label=speech.joined("valid"), lines=days))
    rows.append(Row(id="laser", label=speech.joined("laser"), lines=[label]) if label else None)
    rows.append(outputs(result, speech, figures))
    rows.append(eyewear(result, speech, figures))
    rows.append(distances(result, speech, figures, whole_room=options.whole_room))
    rows.append(Row(id="room", label=speech.joined("room"), lines=[options.room]) if options.room else None)
    rows.append(Row(id="officer", label=speech.joined("officer"), lines=[officer]) if officer else None)
    missing = {
        "evaluation.label": (label, "the laser has no name"),
        "sign.room": (options.room, "no room was given"),
        "sign.lso_name": (officer, "neither name nor telephone was given, and the site has set none"),
        "sign.address": (options.address, "no address of the assessment was given"),
    }
    left_out += [LeftOut(field=f, reason=reason) for f, (value, reason) in missing.items() if not value]
    return [row for row in rows if row is not None]


def _extra(options: SignOptions) -> list[Row]:
    return [Row(id="extra", label="", lines=list(options.extra_lines))] if options.extra_lines else []


def _footer(
    result: EvaluationResult, found: HazardClass, options: SignOptions, speech: Speech, day: str
) -> list[str]:
    digest = result.provenance.request_digest.removeprefix("sha256:")[:12]
    if options.kind == "aperture":
        return []
    if options.kind == "label":
        return [f"{edition(found.title)} · {day}"]
    assessed = f"{speech.joined('assessed')} {day}: {result.rules.title} · {edition(found.title)}"
    return [
        assessed,
        f"{speech.joined('evaluation')} {digest} · Blinkline {result.provenance.service_version}",
    ]


def _label(result: EvaluationResult) -> str:
    """Name of the laser in one line, letters and their accents as one character each."""
    return unicodedata.normalize("NFC", " ".join(result.inputs.get("label", "").split()))


def edition(title: str) -> str:
    """Name and edition of a document without the place in it: IEC 60825-1:2014."""
    return title.partition(" (")[0].partition(", ")[0]
