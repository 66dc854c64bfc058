"""Correlation of pairs of epochs in bins of equally many independent pairs."""

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

__all__ = ["binned_pairs"]

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@njit(cache=True, nogil=True)
def binned_pairs(
    lag_d: Floats, first: Integers, second: Integers, f1: Floats, f2: Floats, population: int
) -> tuple[Floats, Floats, Integers]:
    """Return mean lag, Pearson correlation and number of pairs of each bin.

    Pairs are taken in the order of their lags; one that shares an epoch with a pair in the bin is
    dropped, since it would not be independent. A bin is closed when it has its population; pairs
    left over at the end, too few for a bin, are dropped.

    Parameters
    ----------
    lag_d : float64 (p,)
        Lags of the pairs, ascending.
    first, second : int64 (p,)
        Epoch of either curve.
    f1, f2 : float64 (n,), (m,)
    population : int
        Pairs in each bin, >= 2.

    Returns
    -------
    lags, r : float64 (k,)
        r is NaN where a curve does not vary over the bin's pairs.
    pairs : int64 (k,)
    """
    most = lag_d.size // population
    lags, r = np.empty(most), np.empty(most)
    pairs = np.empty(most, dtype=np.int64)
    # The number of the last bin that an epoch was used in.
    used1, used2 = np.full(f1.size, -1), np.full(f2.size, -1)
    a, b = np.empty(population), np.empty(population)
    bins, count, total = 0, 0, 0.0
    for p in range(lag_d.size):
        i, j = first[p], second[p]
        if used1[i] == bins or used2[j] == bins:
            continue
        used1[i] = used2[j] = bins
        a[count], b[count] = f1[i], f2[j]
        total += lag_d[p]
        count += 1
        if count == population:
            mean_a, mean_b = a.mean(), b.mean()
            aa, ab, bb = 0.0, 0.0, 0.0
            for k in range(population):
                aa += (a[k] - mean_a) ** 2
                bb += (b[k] - mean_b) ** 2
                ab += (a[k] - mean_a) * (b[k] - mean_b)
            lags[bins] = total / population
            r[bins] = ab / math.sqrt(aa * bb) if aa > 0.0 and bb > 0.0 else np.nan
            pairs[bins] = population
            bins, count, total = bins + 1, 0, 0.0
    return lags[:bins], r[:bins], pairs[:bins]
