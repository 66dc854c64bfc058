"""Noise that differs from independent Gaussian deviates of the quoted size."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from planner.kernels.ou_process import ou_path
from planner.model.disturbance import Disturbance

__all__ = ["disturbed_noise"]

Floats = NDArray[np.float64]


def disturbed_noise(
    rng: np.random.Generator, t_d: Floats, normals: Floats, disturbance: Disturbance
) -> Floats:
    """Return deviates in units of the quoted error, made from standard normal ones.

    A share of the variance is a damped random walk in time, common to measurements near each
    other; the total stays 1. Outliers get a second Gaussian deviate on top. The factor by which
    errors are underestimated stretches all.

    Parameters
    ----------
    rng : numpy.random.Generator
        A stream of its own; used only if the disturbance concerns the noise.
    t_d : array (n,)
        Epochs of one telescope, any order, ties allowed; equal epochs share the common part.
    normals : array (n,)
        Standard normal deviates, one for each epoch.
    disturbance : Disturbance

    Returns
    -------
    array (n,)
        `normals` itself if the disturbance leaves the noise alone.

    Raises
    ------
    ValueError
        If there is correlation over no time.
    """
    if disturbance.keeps_noise:
        return normals
    deviates = normals
    if disturbance.correlated_share > 0.0:
        common = _walk(rng, t_d, disturbance.correlation_time_d)
        share = disturbance.correlated_share
        deviates = math.sqrt(1.0 - share) * deviates + math.sqrt(share) * common
    if disturbance.outlier_share > 0.0:
        hit = rng.uniform(size=normals.size) < disturbance.outlier_share
        deviates = deviates + hit * disturbance.outlier_sigma * rng.standard_normal(normals.size)
    return np.asarray(disturbance.error_factor * deviates)


def _walk(rng: np.random.Generator, t_d: Floats, tau_d: float) -> Floats:
    if not tau_d > 0.0:
        raise ValueError(f"need correlation_time_d > 0, got {tau_d}")
    order = np.argsort(t_d, kind="stable")
    walk = np.empty(t_d.size)
    walk[order], _ = ou_path(
        np.asarray(t_d, dtype=np.float64)[order], float(tau_d), rng.standard_normal((t_d.size, 2))
    )
    return walk
