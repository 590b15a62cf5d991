"""What the cover tells of the round itself: its state, how it was made, and the cautions."""

from __future__ import annotations

from foredeck.periods import Frequency
from foredeck.reports.cover_texts import say
from foredeck.reports.page_texts import text
from foredeck.studies import RoundView
from foredeck.wording import catalogue
from foredeck.wording.dates import long_name

_FINGERPRINT = 12
"""Signs of a fingerprint that are printed; the manifest holds it whole."""


def state_words(view: RoundView) -> str:
    """The state of the round, with name and day where it is agreed: "Agreed by R. Lindqvist, 2026-11-06"."""
    words = say(f"state {view.state}")
    if view.made.get("agreed_by"):
        words = say("state by", state=words, name=view.made["agreed_by"])
    if view.made.get("agreed_at"):
        words = say("state on", state=words, day=str(view.made["agreed_at"])[:10])
    return words


def state_notes(view: RoundView) -> list[str]:
    """What a reader must know of the round before reading on: that it was revised, or agreed too late."""
    notes, revision = [], int(view.made.get("revision") or 1)
    if revision > 1 and view.made.get("reason"):
        notes.append(say("revised", revision=revision, reason=str(view.made["reason"]).rstrip(".")))
    if view.made.get("late"):
        notes.append(say("late", noun=Frequency(view.frequency).noun))
    return notes


def made_facts(view: RoundView) -> list[tuple[str, str]]:
    """Names and values that tell how the round was made; what is not known is left out."""
    made, frequency = view.made, Frequency(view.frequency)
    closed = text("closed", when=long_name(view.closing, frequency))
    settings, data = (str(made.get(f"{key}_fingerprint") or "")[:_FINGERPRINT]
                      for key in ("settings", "data"))
    versions = made.get("versions") or {}
    rows = [
        (text("round"), f"{view.round}, {closed}"), (text("state"), state_words(view)),
        (text("source"), "; ".join(map(str, made.get("source") or ()))),
        (text("settings"), text("fingerprint", print=settings) if settings else ""),
        (text("data print"), data),
        (text("ranges"), text("levels", levels=" and ".join(map(str, sorted(view.levels))))),
        (text("fit"), _fit(view)), (text("made at"), str(made.get("made_at") or "")),
        (text("with"), ", ".join(f"{name} {number}" for name, number in versions.items()))]
    return [row for row in rows if row[1]]


def _fit(view: RoundView) -> str:
    fit = view.portfolio
    if not fit.get("n_series"):
        return ""
    words = text("style", style=str(fit.get("style", "")), n=fit["n_series"], words=str(fit.get("words", "")))
    return words.rstrip("; ")


def cautions(frequency: str) -> list[str]:
    """The cautions that every pack carries."""
    found = Frequency(frequency)
    return [catalogue.say(f"caution {number}", noun=found.noun, plural=found.plural)
            for number in range(1, 5)]
