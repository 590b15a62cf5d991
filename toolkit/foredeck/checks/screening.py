"""Which periods of a series stand out: odd values, jumps of the level, slips of the unit."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from itertools import pairwise
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from foredeck.checks.expectation import LONGEST, Array, Expectation, fit, from_scale
from foredeck.checks.intermittence import is_intermittent
from foredeck.checks.limits import query_limits

OPEN_PERIODS = 3
"""The newest periods, in which an odd value and a new level look alike: never repaired."""

FEWEST_PERIODS = 12
"""With fewer known values nothing is called odd."""

_SHORTEST_STRETCH = 4
_ROUNDS = 4
# A slip of the unit is told by its factor: within 10^0.15, or 40 %, of a power of ten.
_UNIT_MISS = 0.15
_ORDINARY = 3.0


@dataclass(frozen=True)
class Standout:
    """One period that stands out.

    Attributes
    ----------
    position : int
        0-based position in the series; of a jump, its first period.
    code : {"outlier", "level_shift", "change_of_unit"}
    raw : float
        The value as it stands.
    expected : float
        What the other periods suggest; of a jump, what would have stood without it.
    low, high : float
        About nine ordinary values in ten would lie between these.
    factor : float
        For a change of unit the power of ten (10 = ten times too much); for a jump the
        ratio of the new level to the old one; 1 for an outlier.
    size : float
        Standard deviations from what was expected, with its sign.
    lasting : bool
        True of a jump: what begins here goes on to the end or to the next jump.
    level : float
        Of a jump, what is expected of its first period; NaN otherwise.
    """

    position: int
    code: Literal["outlier", "level_shift", "change_of_unit"]
    raw: float
    expected: float
    low: float
    high: float
    factor: float
    size: float
    lasting: bool = False
    level: float = np.nan


@dataclass(frozen=True)
class Screening:
    """What stands out in a series, and what its missing periods are expected to be.

    Attributes
    ----------
    standouts : tuple of Standout
        By position.
    expected : array, shape (n,); the series' unit
        What all other periods suggest for each one; the raw value where nothing can be said.
    judged : bool
        False when the series is too short, too even or too intermittent to be judged:
        then `expected` is `values`.
    """

    standouts: tuple[Standout, ...]
    expected: Array
    judged: bool


@dataclass
class _Found:
    """Positions under suspicion while the search goes on."""

    spikes: list[int] = field(default_factory=list)
    steps: list[int] = field(default_factory=list)


def screen(values: Array, season_length: int) -> Screening:
    """Find the periods that stand out from level and season.

    Outliers, jumps and the model are found in turns, the furthest first, each measured
    with all others allowed for (Chen & Liu 1993); slips of the unit are set right before
    the rest is judged.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN is a missing period. Of a history longer than 320 periods, each piece of that
        length is judged by itself.
    season_length : int
        Periods a year (1, 4, 12, 52).

    Returns
    -------
    Screening

    References
    ----------
    Chen & Liu (1993), Journal of the American Statistical Association 88, 284-297.
    """
    n = values.size
    if n > LONGEST:
        return _screen_in_pieces(values, season_length)
    known = np.isfinite(values)
    nothing = Screening((), np.array(values), judged=False)
    if is_intermittent(values) or (known.sum() < FEWEST_PERIODS and n < 2 * season_length):
        return nothing
    found, model = _search(values, season_length, _Found())
    if model is None:
        return nothing
    slips = _unit_slips(values, found, model)
    taken = {slip.position for slip in slips}
    if slips:
        mended = np.array(values)
        for slip in slips:
            mended[slip.position] /= slip.factor
        found, second = _search(mended, season_length,
                                _Found([p for p in found.spikes if p not in taken], found.steps))
        if second is not None:
            model = second
            slips = [_measured_again(slip, model) for slip in slips]
    rest = [_odd_value(p, values, model) for p in found.spikes if p not in taken]
    rest += [_jump(p, values, model) for p in found.steps]
    expected = np.where(np.isfinite(model.spread), model.expected(), values)
    return Screening(tuple(sorted([*slips, *rest], key=lambda s: s.position)), expected, judged=True)


def _screen_in_pieces(values: Array, season_length: int) -> Screening:
    """Judge a long history in pieces, counted from its end; the oldest piece overlaps the next."""
    n = values.size
    expected, standouts, judged = np.array(values), [], False
    end = n
    while end > 0:
        start = max(0, end - LONGEST)
        piece = screen(values[start:max(end, LONGEST)], season_length)
        expected[start:end] = piece.expected[:end - start]
        standouts += [replace(s, position=s.position + start) for s in piece.standouts
                      if s.position + start < end]
        judged |= piece.judged
        end = start
    return Screening(tuple(sorted(standouts, key=lambda s: s.position)), expected, judged)


def _search(values: Array, season_length: int, found: _Found) -> tuple[_Found, Expectation | None]:
    """Find spikes and steps, choosing the model anew with what was found until both settle."""
    missing = np.flatnonzero(~np.isfinite(values))
    limits = query_limits(season_length, values.size - missing.size)
    judging = values.size - missing.size >= FEWEST_PERIODS
    most = max(2, values.size // 8) if judging else 0
    model = _fit(values, season_length, missing, found)
    for _ in range(_ROUNDS):
        start = model
        for _ in range(2 * most):
            if model is None:
                return found, None
            dropped = _drop(found, model, limits)
            added = len(found.spikes) + len(found.steps) < most and _add(found, model, limits, missing)
            if not dropped and not added:
                break
            model = _fit(values, season_length, missing, found, like=start)
        if model is start:
            break
        model = _fit(values, season_length, missing, found)
    return found, model


def _fit(values: Array, season_length: int, missing: NDArray[np.intp], found: _Found,
         like: Expectation | None = None) -> Expectation | None:
    left_out = np.array(sorted({*missing.tolist(), *found.spikes}), dtype=np.intp)
    if found.steps:
        speaks = np.ones(values.size, dtype=bool)
        speaks[left_out] = False
        found.steps = _borne_out(sorted(found.steps), speaks)
    return fit(values, season_length, left_out, np.array(found.steps, dtype=np.intp), like)


def _borne_out(steps: list[int], speaks: NDArray[np.bool_]) -> list[int]:
    """Steps with two periods that speak on either side; a level of which none speaks cannot be fitted."""
    kept: list[int] = []
    for i, step in enumerate(steps):
        begin = kept[-1] if kept else 0
        end = steps[i + 1] if i + 1 < len(steps) else speaks.size
        if speaks[begin:step].sum() >= 2 and speaks[step:end].sum() >= 2:
            kept.append(step)
    return kept


def _drop(found: _Found, model: Expectation, limits: tuple[float, float]) -> bool:
    """Clear the suspicion that, all others allowed for, no longer holds."""
    spikes = [p for p in found.spikes if abs(model.spike_t[p]) > limits[0]]
    steps = [p for p in found.steps if abs(model.step_t[p]) > limits[1]]
    dropped = len(spikes) < len(found.spikes) or len(steps) < len(found.steps)
    found.spikes, found.steps = spikes, steps
    return dropped


def _add(found: _Found, model: Expectation, limits: tuple[float, float], missing: NDArray[np.intp]) -> bool:
    """Put the furthest period not yet under suspicion under suspicion, if it is far enough."""
    n = model.z.size
    spike = np.abs(model.spike_t) / limits[0]
    spike[missing] = 0.0
    spike[found.spikes] = 0.0
    step = np.zeros(n)
    allowed = step_range(n)
    step[allowed] = np.abs(model.step_t[allowed]) / limits[1]
    # A jump begins with a period that speaks: one earlier would look exactly the same.
    step[missing] = 0.0
    step[found.spikes] = 0.0
    for known in found.steps:
        step[max(0, known - _SHORTEST_STRETCH + 1):known + _SHORTEST_STRETCH] = 0.0
    a, b = int(np.argmax(spike)), int(np.argmax(step))
    if max(spike[a], step[b]) <= 1.0:
        return False
    if spike[a] >= step[b]:
        found.spikes.append(a)
    else:
        found.steps.append(b)
    return True


def _odd_value(p: int, values: Array, model: Expectation) -> Standout:
    return Standout(p, "outlier", float(values[p]), *_expected_at(p, model), 1.0, float(model.spike_t[p]))


def _jump(p: int, values: Array, model: Expectation) -> Standout:
    after, before = _levels(p, model)
    factor = after / before if before > 0 and after > 0 else 1.0
    k = _power_of_ten(factor)
    _, low, high = _expected_at(p, model)
    return Standout(p, "change_of_unit" if k else "level_shift", float(values[p]), before, low, high,
                    10.0 ** k if k else factor, float(model.step_t[p]), lasting=True, level=after)


def _expected_at(p: int, model: Expectation) -> tuple[float, float, float]:
    return (float(model.expected()[p]), float(model.expected(-1.645)[p]), float(model.expected(1.645)[p]))


def _levels(p: int, model: Expectation) -> tuple[float, float]:
    """What is expected of a period with the jump that begins there, and without it."""
    after = model.z[p] - model.spike[p]
    pair = from_scale(np.array([after, after - model.step[p]]), model.scale) * model.unit
    return float(pair[0]), float(pair[1])


def _power_of_ten(ratio: float) -> int:
    """Return k when a ratio is about 10^k with |k| from 1 to 3, else 0."""
    if ratio <= 0:
        return 0
    k = round(float(np.log10(ratio)))
    return k if 1 <= abs(k) <= 3 and abs(np.log10(ratio) - k) <= _UNIT_MISS else 0


def _unit_slips(values: Array, found: _Found, model: Expectation) -> list[Standout]:
    """Periods recorded in another unit: single ones, and stretches between two opposite jumps."""
    slips = []
    for p in found.spikes:
        expected, low, high = _expected_at(p, model)
        k = _power_of_ten(values[p] / expected) if expected > 0 else 0
        if k and abs(model.distance(values[p] / 10.0 ** k, p)) <= _ORDINARY:
            slips.append(Standout(p, "change_of_unit", float(values[p]), expected, low, high, 10.0 ** k,
                                  float(model.spike_t[p])))
    steps = sorted(found.steps)
    powers = [_power_of_ten(_jump(p, values, model).factor) for p in steps]
    for (begin, k), (end, back) in pairwise(zip(steps, powers, strict=True)):
        if k and back == -k:
            slips += [Standout(p, "change_of_unit", float(values[p]), float(values[p]) / 10.0 ** k, np.nan,
                               np.nan, 10.0 ** k, float(model.step_t[begin]))
                      for p in range(begin, end) if np.isfinite(values[p])]
    return slips


def _measured_again(slip: Standout, model: Expectation) -> Standout:
    expected, low, high = _expected_at(slip.position, model)
    return replace(slip, expected=expected, low=low, high=high)


def step_range(n: int) -> slice:
    """Positions at which a jump may begin: a stretch of under four periods is told as odd values."""
    return slice(_SHORTEST_STRETCH, max(n - _SHORTEST_STRETCH + 1, _SHORTEST_STRETCH))
