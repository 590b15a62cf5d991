"""The head of a series page: headline, five answers, and the strip of the next period."""

from __future__ import annotations

from html import escape

from foredeck.charts.pictures import Picture
from foredeck.charts.strip_picture import strip
from foredeck.reports.fragments import Head
from foredeck.reports.page_texts import text
from foredeck.studies import Study
from foredeck.wording.answers import Answer, answers, headline
from foredeck.wording.catalogue import upper_first
from foredeck.wording.dates import long_name
from foredeck.wording.facts import facts_of

LONG = 14
"""Letters from which the big figure of an answer is set smaller, so that it stays in its column."""


def head(study: Study, link: tuple[str, str] | None = None) -> Head:
    """Make the head of the page.

    Parameters
    ----------
    link : (text, address) or None
        The way back to the pack's cover.
    """
    facts = facts_of(study)
    when = long_name(study.closing, facts.frequency)
    parts: list[str | Picture] = [answers_html(answers(facts))] if facts.forecast else []
    picture = strip(study, write=facts.figures.text, edge=facts.edges.text)
    if picture is not None:
        parts.append(f'<figure class="strip-figure"><figcaption class="vh">'
                     f"{escape(text('strip caption', when=upper_first(long_name(facts.next_period, facts.frequency))))}"
                     f"</figcaption>{picture.html()}</figure>")
    named = text("round of", round=study.round, state=study.state) if study.round else text("no round")
    return Head(
        title=text("title", name=study.name, round=study.round or when), heading=headline(facts),
        kick=(study.name, text("what", frequency=upper_first(facts.frequency.value), unit=study.unit),
              f"{named}, {text('closed', when=when)}"),
        parts=parts, running=(f"{study.name}: {facts.frequency.value} {study.unit}", named), link=link)


def answers_html(given: list[Answer]) -> str:
    """Write questions and answers as a list of descriptions."""
    rows = []
    for answer in given:
        big = f'<span class="plum">{escape(answer.big)}</span>' if answer.expected else escape(answer.big)
        small = f" <small>{escape(answer.small)}</small>" if answer.small else ""
        lead = f"<b>{escape(answer.lead)}</b> " if answer.lead else ""
        form = "big long" if len(answer.big) > LONG else "big"
        rows.append(f'<div><dt>{escape(answer.question)}</dt><dd class="{form}">{big}{small}</dd>'
                    f"<dd>{lead}{escape(answer.text)}</dd></div>")
    return f'<dl class="answers">{"".join(rows)}</dl>'
