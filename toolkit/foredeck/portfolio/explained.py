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


def fit_facts(alones: Sequence[Alone], procedures: Sequence[Procedure], learned: Learned) -> dict[str, Any]:
    """Figures that explain the fit, as plain JSON values.

    Returns
    -------
    dict
        `weights` and `standing` by method (now, only those that speak), `used` (series by
        method that leads their forecast), `half` (how many of the latest periods hold half
        of the weight; None where no method has an alpha), `edge_then` and `edge_after`
        (by what share the method that had done best on a series up to a year of origins
        ago missed less than the methods on average, up to then and since; None where not
        known), `own_share` (how far the portfolio's own backtests count beside the prior).
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
        "own_share": smooth / (smooth + PRIOR_SERIES)}


def half_weight(alones: Sequence[Alone], procedures: Sequence[Procedure]) -> int | None:
    """Number of latest periods that hold half of the weight, at the portfolio's median alpha."""
    alphas = []
    for alone, procedure in zip(alones, procedures, strict=True):
        known = [(weight, held["alpha"]) for weight, held in zip(procedure.weights[-1], alone.constants, strict=True)
                 if weight > 0 and "alpha" in held]
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
    parts = [_blend_words(facts) if style == "blend" else _single_words(facts, n_series)]
    half = facts["half"]
    if half is not None:
        parts.append(f"Half of the weight lies on the latest {'' if half == 1 else f'{half} '}"
                     f"{period[0] if half == 1 else period[1]}.")
    parts.append(_edge_words(facts))
    series = "one series" if n_series == 1 else f"{n_series} series"
    parts.append(f"Ranges come from the misses of past forecasts, pooled over {series}.")
    return " ".join(part for part in parts if part)


def _blend_words(facts: Mapping[str, Any]) -> str:
    weights, standing = facts["weights"], facts["standing"]
    if not weights:
        return "Every series is forecast by the plain mean of the methods for intermittent demand."
    if len(weights) == 1:
        return f"Every series is forecast by one method: {METHODS[next(iter(weights))].title}."
    leader = max(weights, key=lambda name: weights[name])
    share = 100 * (1 - np.exp(standing[leader]))
    than = "as much as the methods on average" if abs(share) < 0.5 else \
        f"{abs(share):.0f} % {'less' if share > 0 else 'more'} than the methods on average"
    own = round(100 * facts["own_share"])
    return (f"The forecast is a blend of {len(weights)} methods, led by {METHODS[leader].title} "
            f"({100 * weights[leader]:.0f} %), which missed {than} in the backtests of this portfolio. These backtests "
            f"count {own} % in the weights, the usual weights the rest; on each series, methods that missed less on it "
            f"count more.")


def _single_words(facts: Mapping[str, Any], n_series: int) -> str:
    used = sorted(facts["used"].items(), key=lambda item: -item[1])
    named = ", ".join(f"{METHODS[name].title} on {count}" for name, count in used[:3])
    rest = "" if len(used) <= 3 else ", and others"
    return (f"Each series is forecast by one method, settled by its own backtest and the portfolio's, and kept until "
            f"another is clearly better: {named}{rest} of {n_series} series.")


def _edge_words(facts: Mapping[str, Any]) -> str:
    then, after = facts["edge_then"], facts["edge_after"]
    if then is None:
        return ""
    worth = f"{100 * after:.0f} % less" if after >= 0.005 else \
        f"{-100 * after:.0f} % more" if after <= -0.005 else "as much"
    return (f"The method that had done best on a series a year earlier missed {100 * then:.0f} % less than the methods "
            f"on average up to then, and {worth} since: that is what a winner's lead is worth.")
