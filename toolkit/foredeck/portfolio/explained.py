"""What the portfolio fit says of itself in words, and the figures behind the words."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.backtests.measures import mean_of
from foredeck.portfolio.alone import YEAR_OF_ORIGINS, Alone
from foredeck.portfolio.procedure import Procedure
from foredeck.portfolio.weights import PRIOR_SERIES, Learned
from foredeck.smoothing.catalogue import METHODS

Array = NDArray[np.float64]

_PERSONS = ("Croston", "Holt", "Syntetos", "Teunter")


def fit_facts(alones: Sequence[Alone], procedures: Sequence[Procedure], learned: Learned) -> dict[str, Any]:
    """Figures that explain the fit, as plain JSON values.

    Returns
    -------
    dict
        `weights` and `standing` by method (now, only those that speak), `used` (series by
        method that leads their forecast), `half` (how many of the latest periods hold half
        of the weight; None where no method has an alpha), `edge_then` and `edge_after`
        (by what share the method that had done best on a series up to `edge_back` periods
        ago missed less than the methods on average, up to then and since; None where not
        known), `own_share` (how far the portfolio's own backtests count beside the prior),
        `intermittent` (series with the demand-rate family).
    """
    speaking = [name for name, weight in zip(learned.methods, learned.weights[0], strict=True) if weight > 0]
    at = {name: place for place, name in enumerate(learned.methods)}
    smooth = sum(not alone.pattern.intermittent for alone in alones)
    led = [learned.methods[int(np.argmax(procedure.weights[-1]))] for procedure in procedures]
    then, after = winners_edge(alones, learned)
    return {
        "weights": {name: float(learned.weights[0, at[name]]) for name in speaking},
        "standing": {name: float(learned.standing[0, at[name]]) for name in speaking},
        "used": {name: led.count(name) for name in learned.methods if name in led},
        "half": half_weight(alones, procedures), "edge_then": then, "edge_after": after,
        "edge_back": YEAR_OF_ORIGINS[alones[0].series.season_length],
        "own_share": smooth / (smooth + PRIOR_SERIES),
        "intermittent": len(alones) - smooth}


def half_weight(alones: Sequence[Alone], procedures: Sequence[Procedure]) -> int | None:
    """Number of latest periods that hold half of the weight, at the portfolio's median alpha."""
    alphas = []
    for alone, procedure in zip(alones, procedures, strict=True):
        # a demand rate's alpha counts demands, not periods
        known = [(weight, held["alpha"]) for weight, held in zip(procedure.weights[-1], alone.constants, strict=True)
                 if weight > 0 and "alpha" in held] if not alone.pattern.intermittent else []
        if known:
            weight, alpha = np.array(known).T
            alphas.append(float(weight @ alpha / weight.sum()))
    if not alphas:
        return None
    # weights alpha (1 - alpha)^k: the first n hold 1 - (1 - alpha)^n of them
    alpha = min(max(float(np.median(alphas)), 1e-4), 1 - 1e-9)
    return max(1, int(np.ceil(np.log(0.5) / np.log1p(-alpha) - 1e-9)))


def winners_edge(alones: Sequence[Alone], learned: Learned) -> tuple[float | None, float | None]:
    """What a winner's lead looked like, and what it was worth afterwards.

    On each series the method with the smallest mean absolute error known a year of origins
    before the closing period; its lead over the geometric mean of the methods then, and on
    the forecasts made since. Shares, averaged over the series by logarithm.
    """
    then, after = [], []
    for alone in alones:
        cut = YEAR_OF_ORIGINS[alone.series.season_length]
        proper = [METHODS[name].family == "smoothing" and learned.weights[0, place] > 0
                  for place, name in enumerate(learned.methods)]
        members = np.array(proper) & alone.pool[:, -1]
        sizes = np.abs(alone.cube.errors[members])
        before = alone.cube.known_cells(len(alone.raw) - cut)
        since = (alone.offsets <= cut)[:, None] & np.isfinite(alone.cube.actual)
        if len(sizes) < 2 or not before.any() or not since.any():
            continue
        old, new = (_log_errors(sizes, cells) for cells in (before, since))
        if np.isfinite(old).all() and np.isfinite(new).all():
            winner = int(np.argmin(old))
            then.append(old[winner] - old.mean())
            after.append(new[winner] - new.mean())
    if not then:
        return None, None
    return 1 - float(np.exp(np.mean(then))), 1 - float(np.exp(np.mean(after)))


def _log_errors(sizes: Array, cells: NDArray[np.bool_]) -> Array:
    shared = cells & np.isfinite(sizes).all(axis=0)
    found = mean_of(sizes[:, shared], axis=1) if shared.any() else np.full(len(sizes), np.nan)
    with np.errstate(divide="ignore"):  # a perfect forecast has no logarithm and says nothing of a lead
        return np.asarray(np.where(found > 0, np.log(found), np.nan))


def fit_words(style: str, n_series: int, facts: Mapping[str, Any], period: tuple[str, str]) -> str:
    """The fit in sentences.

    Parameters
    ----------
    period : tuple of str
        Singular and plural of the frequency's noun.
    """
    parts = [_blend_words(facts, n_series) if style == "blend" else _single_words(facts, n_series),
             _half_words(facts["half"], period), _edge_words(style, facts, n_series, period)]
    parts.append(_range_words(n_series, facts["intermittent"]))
    return " ".join(part for part in parts if part)


def _blend_words(facts: Mapping[str, Any], n_series: int) -> str:
    weights, standing = facts["weights"], facts["standing"]
    if not weights:
        return "Every series is forecast by the plain mean of the methods for intermittent demand."
    if len(weights) == 1:
        return f"Every series is forecast by one method: {named_in_a_sentence(next(iter(weights)))}."
    leader = max(weights, key=lambda name: weights[name])
    lead = 1 - float(np.exp(standing[leader]))
    than = "as much as the methods do" if abs(lead) < 0.005 else \
        f"{percent(abs(lead))} {'less' if lead > 0 else 'more'} than the methods do"
    where, each = ("Over the portfolio the", "on each series the methods that missed less on it") if n_series > 1 else \
        ("The", "methods that missed less")
    return (f"{where} forecast is a blend of {len(weights)} methods, led by {named_in_a_sentence(leader)} with "
            f"{percent(weights[leader])}: in the backtests it missed {than} on average. Weights begin nearly equal; "
            f"these backtests count {percent(facts['own_share'])} in them, and {each} count more.")


def _single_words(facts: Mapping[str, Any], n_series: int) -> str:
    used = sorted(facts["used"].items(), key=lambda item: -item[1])
    named = ", ".join(f"{named_in_a_sentence(name)} on {count}" for name, count in used[:3])
    rest = "" if len(used) <= 3 else ", and others"
    return (f"Each series is forecast by one method, settled by its own backtest and the portfolio's, and kept until "
            f"another is clearly better: {named}{rest} of {n_series} series.")


def _half_words(half: int | None, period: tuple[str, str]) -> str:
    if half is None:
        return ""
    if half == 1:
        return f"The latest {period[0]} counts for half or more of the level that a forecast starts from."
    return (f"The latest {half} {period[1]} count for half of the level that a forecast starts from, all earlier ones "
            f"for the other half.")


def _edge_words(style: str, facts: Mapping[str, Any], n_series: int, period: tuple[str, str]) -> str:
    then, after = facts["edge_then"], facts["edge_after"]
    if then is None:
        return ""
    since = f"{percent(abs(after))} {'ahead' if after > 0 else 'behind'} since" if abs(after) >= 0.005 \
        else "level with it since"
    why = "Why not the winner alone?" if style == "blend" else "Why not simply the winner?"
    return (f"{why} On {'each' if n_series > 1 else 'this'} series, the method that had missed "
            f"least until {facts['edge_back']} {period[1]} ago was {percent(then)} ahead of the methods' average then, "
            f"and {since}: that is what a winner's lead is worth.")


def _range_words(n_series: int, intermittent: int) -> str:
    own = "Ranges of intermittent series come from how often demand came, and how large it was."
    if intermittent == n_series:
        return own
    ordinary = n_series - intermittent
    series = "one series" if ordinary == 1 else f"{ordinary} series"
    pooled = f"Ranges come from the misses of past forecasts, pooled over {series}."
    return f"{pooled} {own}" if intermittent else pooled


def named_in_a_sentence(method: str) -> str:
    """Title of a method as it stands within a sentence: small, unless it begins with a person's name."""
    title = METHODS[method].title
    return title if title.startswith(_PERSONS) else f"{title[0].lower()}{title[1:]}"


def percent(part: float) -> str:
    """A part of 1 in whole per cent, as the pages write it."""
    return f"{100 * part:.0f}%"
