"""Spells of clear and lost nights: a two-state Markov chain whose numbers change with the month.

The chain's parameters are what observers know: the clear fraction p of each month and the mean
length b of a run of lost nights. A lost night is followed by a clear one with probability
a = 1/b. Each night's chance of being clear is then p exactly if a clear night is followed by a
clear one with probability [p_t - (1 - p_{t-1}) a] / p_{t-1}. First-order chains of this kind go
back to Gabriel & Neumann (1962, QJRMS 88, 90), who used them for daily rain.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from planner.model.observatory import WeatherClimate

__all__ = ["clear_nights", "expected_clear", "impossible"]

MJD_EPOCH = np.datetime64("1858-11-17", "D")
MONTHS = (
    "January", "February", "March", "April", "May", "June", "July", "August", "September",
    "October", "November", "December",
)  # fmt: skip


def expected_clear(climate: WeatherClimate, nights: NDArray[np.int64]) -> NDArray[np.float64]:
    """Return each night's chance of being clear.

    Parameters
    ----------
    climate : WeatherClimate
        Of the site.
    nights : (n,) int64
        MJD of each evening's date.

    Returns
    -------
    (n,) float64
        The clear fraction of the evening's month.
    """
    dates = MJD_EPOCH + np.asarray(nights).astype("timedelta64[D]")
    month = dates.astype("datetime64[M]").astype(np.int64) % 12
    return np.asarray(climate.clear_fraction, dtype=np.float64)[month]


def clear_nights(
    climate: WeatherClimate, nights: NDArray[np.int64], uniforms: NDArray[np.float64]
) -> NDArray[np.bool_]:
    """Return which nights are clear, for many trials.

    Parameters
    ----------
    climate : WeatherClimate
        Of the site.
    nights : (n,) int64
        MJD of each evening's date, consecutive.
    uniforms : (trials, n) float64
        Independent draws, uniform in [0, 1).

    Returns
    -------
    (trials, n) bool
        Every night is clear with exactly the probability of `expected_clear`.

    Notes
    -----
    A night's draw u decides alone, whatever the night before, if it lies below or above both
    chances of being clear, the one after a clear night and the one after a lost night. In between
    it keeps the state of the night before, or, where clear nights are the less likely to go on,
    turns it round. So the state is that of the last night decided alone, turned round as often as
    draws since then say: no loop over nights is needed.
    """
    after_clear, after_lost = _chances(climate, int(nights[0]) if nights.size else 0, nights.size)
    decided = (uniforms < np.minimum(after_clear, after_lost)) | (
        uniforms >= np.maximum(after_clear, after_lost)
    )
    turned = np.cumsum(~decided & (after_clear < after_lost), axis=1)
    column = np.arange(uniforms.shape[1])
    last = np.maximum.accumulate(np.where(decided, column, 0), axis=1)
    state = np.take_along_axis(uniforms < after_clear, last, axis=1)
    turns: NDArray[np.int64] = turned - np.take_along_axis(turned, last, axis=1)
    return np.asarray(state ^ (turns % 2 == 1))


def impossible(climate: WeatherClimate) -> str | None:
    """Say why bad spells cannot be as short as asked in some month; None if they can.

    Even if every clear night stood alone, spells of lost nights would last (1 - p) / p on average.
    Where that is longer than asked for, `clear_nights` keeps the clear fraction and lengthens the
    spells. A month that is never clear is a closure, and no fault.
    """
    at_least = {
        month: (1 - clear) / clear
        for month, clear in zip(MONTHS, climate.clear_fraction, strict=True)
        if clear > 0
    }
    short = [m for m, nights in at_least.items() if climate.bad_spell_nights < nights * (1 - 1e-9)]
    if not short:
        return None
    longest = max(at_least[m] for m in short)
    return (
        f"bad spells of {climate.bad_spell_nights:g} nights on average are too short for so few "
        f"clear nights in {', '.join(short)}: they must last at least {longest:.1f} nights"
    )


@lru_cache(maxsize=64)
def _chances(
    climate: WeatherClimate, first: int, count: int
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the chance of each night to be clear after a clear and after a lost night.

    Shape (n,) each, of consecutive nights; both are p on the first night. Where the month's change,
    or too few clear nights, would ask for a chance below 0 or above 1 after a clear night, the
    chance after a lost night gives way, so that the night's own chance stays exact. Kept, because
    all trials share it.
    """
    now = expected_clear(climate, np.arange(first, first + count))
    before = now[:-1]
    lost_before = 1 - before
    with np.errstate(divide="ignore", invalid="ignore"):
        least = np.where(lost_before > 0, (now[1:] - before) / lost_before, 0.0)
        most = np.where(lost_before > 0, now[1:] / lost_before, 1.0)
        chance = np.clip(1 / climate.bad_spell_nights, least, np.minimum(most, 1.0))
        after_clear = np.where(before > 0, (now[1:] - lost_before * chance) / before, chance)
    after_lost = np.concatenate((now[:1], chance))
    return np.concatenate((now[:1], np.clip(after_clear, 0.0, 1.0))), after_lost
