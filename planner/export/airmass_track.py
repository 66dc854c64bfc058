"""The airmass of a night's targets as points of a small drawing."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["HEIGHT", "SAMPLES", "WIDTH", "look", "ticks", "track"]

WIDTH, HEIGHT = 1000, 150
"""Of the area between the axes, in the drawing's own units."""
SAMPLES = 41
"""Points of a target's track from dusk to dawn."""

_COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#000000", "#E69F00", "#56B4E9")
"""Told apart by colour-blind eyes (Okabe and Ito 2008)."""
_DASHES = ("none", "9 4", "3 3")


def look(number: int) -> dict[str, str]:
    """Return colour and dashes of a night's target; 21 differ."""
    return {
        "colour": _COLOURS[number % len(_COLOURS)],
        "dash": _DASHES[number // len(_COLOURS) % len(_DASHES)],
    }


def track(share: NDArray[np.float64], airmass: NDArray[np.float64], limit: float) -> list[str]:
    """Return one target's track as the points of polylines, broken where it is above the limit.

    Parameters
    ----------
    share : ndarray, shape (times,)
        Times as shares of the night's dark time.
    airmass : ndarray, shape (times,)
    limit : float
        Airmass at the foot of the drawing.
    """
    lines: list[str] = []
    points: list[str] = []
    for x, value in zip([*share, 0.0], [*airmass, math.inf], strict=True):
        if value <= limit:
            points.append(f"{WIDTH * x:.0f},{_height(value, limit):.0f}")
        else:
            lines += [" ".join(points)] if len(points) > 1 else []
            points = []
    return lines


def ticks(
    start_mjd: float, end_mjd: float, limit: float
) -> tuple[list[dict[str, Any]], list[dict[str, Any]]]:
    """Return where the hours of UTC and a few airmasses stand; `limit` is the last of these."""
    first, last = math.ceil(start_mjd * 24 - 1e-9), math.floor(end_mjd * 24 + 1e-9)
    hours = [
        {"x": round(WIDTH * (hour / 24 - start_mjd) / (end_mjd - start_mjd)), "hour": hour % 24}
        for hour in range(first, last + 1)
    ]
    marks = [1.0, *_between(limit), limit]
    return hours, [{"y": round(_height(mark, limit)), "airmass": f"{mark:g}"} for mark in marks]


def _between(limit: float) -> Sequence[float]:
    """Return round airmasses between 1 and the limit that leave room for both."""
    step = 0.5 if limit > 1.75 else 0.2
    return [m for k in range(1, 20) if (m := round(1 + k * step, 1)) < limit - step / 2]


def _height(airmass: float, limit: float) -> float:
    """Return the distance from the drawing's top; airmass 1 is at the top."""
    return HEIGHT * (airmass - 1.0) / max(limit - 1.0, 1e-6)
