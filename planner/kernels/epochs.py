"""Which nights of a run a repeated visit falls on."""

from __future__ import annotations

import numpy as np
from numba import njit

__all__ = ["nights_taken"]


@njit(cache=True, nogil=True)
def nights_taken(night, usable, first, last, cadence_nights):  # type: ignore[no-untyped-def]
    """Return which of the nights on offer are used by visits repeated at a cadence.

    A visit is made on the first usable night on which it is due. The next falls due one cadence
    after this one was due, or, if this one was late by a night or more, one cadence after it was
    made: a missed visit is caught up as soon as possible and the rhythm goes on from there.

    Parameters
    ----------
    night : (n,) int64
        Nights on offer, ascending.
    usable : (n,) bool
        Whether the night is clear.
    first, last : (s,) int64
        First and last night of each observing season, inclusive, ascending. The rhythm starts
        afresh in each.
    cadence_nights : float
        Wanted spacing, >= 1.

    Returns
    -------
    (n,) bool
        Nights on which a visit is made.
    """
    taken = np.zeros(night.size, dtype=np.bool_)
    for season in range(first.size):
        due = float(first[season])
        for i in range(night.size):
            if night[i] < first[season] or night[i] > last[season]:
                continue
            if usable[i] and night[i] >= due:
                taken[i] = True
                if night[i] - due < 1.0:
                    due += cadence_nights
                else:
                    due = night[i] + cadence_nights
    return taken
