"""Texts by key, so that another language is another file of the same keys."""

from __future__ import annotations

from typing import Any

from foredeck.wording import english

LANGUAGE = "en"
MONTHS = english.MONTHS


def say(key: str, **facts: Any) -> str:
    """Return the text of a key with its facts filled in.

    Raises
    ------
    KeyError
        if the key, or a fact that the text names, is missing: a fault of the program.
    """
    return english.TEXTS[key].format(**facts)


def one_or_many(key: str, count: int, **facts: Any) -> str:
    """Return the text of `key` in singular ("key|1") or plural ("key|n"); `count` is a fact too."""
    return say(f"{key}|{'1' if count == 1 else 'n'}", count=count, **facts)


def upper_first(text: str) -> str:
    """Begin a sentence with a capital letter."""
    return text[:1].upper() + text[1:]


def lower_first(text: str) -> str:
    """Begin with a small letter what stands within a sentence."""
    return text[:1].lower() + text[1:]


def method_name(method: str) -> str:
    """Return what readers see of a method, its twin on logarithms or with relative errors included.

    One that has no text keeps its own name.
    """
    known = english.TEXTS.get(f"method {method}")
    if known is not None:
        return known
    if method.startswith("log_"):
        return say("method variant log", method=method_name(method.removeprefix("log_")))
    if method.endswith("_relative"):
        return say("method variant relative", method=method_name(method.removesuffix("_relative")))
    return upper_first(method.replace("_", " "))
