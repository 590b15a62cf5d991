"""How often demand comes, and how much its size varies: the quadrant of intermittence."""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray

ADI_LIMIT = 1.32
"""From here on demand counts as intermittent (Syntetos, Boylan & Croston 2005)."""

CV2_LIMIT = 0.49
"""From here on the size of demand counts as erratic (Syntetos, Boylan & Croston 2005)."""

DemandClass = Literal["smooth", "erratic", "intermittent", "lumpy"]


def average_demand_interval(values: NDArray[np.float64]) -> float:
    """Average demand interval: known periods divided by periods with demand.

    Two definitions are in use; this is periods / non-zero periods, not the mean of the
    gaps between demands.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN is a missing period and counts in neither number.

    Returns
    -------
    float; periods; 1.0 when nothing is known, infinity when there was never any demand

    References
    ----------
    Syntetos, Boylan & Croston (2005), Journal of the Operational Research Society 56, 495-503.
    """
    known = values[np.isfinite(values)]
    demands = int(np.count_nonzero(known))
    if known.size == 0:
        return 1.0
    return known.size / demands if demands else float("inf")


def squared_variation(values: NDArray[np.float64]) -> float:
    """Squared coefficient of variation of the non-zero values.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN and zero are left out.

    Returns
    -------
    float; no unit; 0.0 with fewer than two non-zero values

    References
    ----------
    Syntetos, Boylan & Croston (2005), Journal of the Operational Research Society 56, 495-503.
    """
    sizes = values[np.isfinite(values) & (values != 0.0)]
    if sizes.size < 2:
        return 0.0
    return float((np.std(sizes, ddof=1) / np.mean(sizes)) ** 2) if np.mean(sizes) else float("inf")


def is_intermittent(values: NDArray[np.float64]) -> bool:
    """Whether demand is missing in so many periods that the average interval reaches 1.32."""
    return average_demand_interval(values) >= ADI_LIMIT


def demand_class(adi: float, cv2: float) -> DemandClass:
    """Quadrant of intermittence, in the literature's words.

    Parameters
    ----------
    adi : float; periods
        from `average_demand_interval`.
    cv2 : float
        from `squared_variation`.

    References
    ----------
    Syntetos, Boylan & Croston (2005), figure 3: cut-offs 1.32 and 0.49.
    """
    if adi < ADI_LIMIT:
        return "smooth" if cv2 < CV2_LIMIT else "erratic"
    return "intermittent" if cv2 < CV2_LIMIT else "lumpy"
