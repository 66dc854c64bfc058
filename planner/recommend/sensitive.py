"""How the success of a recommended layout depends on what is uncertain."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from planner.model.campaign import Layout
from planner.model.plan import Sensitivity
from planner.model.target import Forecast
from planner.model.trial import Prospect, TrialTable
from planner.scoring import (
    Setting,
    normals_of,
    place_in,
    reweighted,
    sensitivities,
    sky_of_trial,
)

__all__ = ["sensitivities_of"]

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]


def sensitivities_of(
    setting: Setting,
    others: Sequence[Forecast],
    prospect: Prospect,
    layout: Layout,
    table: TrialTable,
) -> tuple[Sensitivity, ...]:
    """Return the success of a layout at several lags, amplitudes, timescales and weathers.

    And with `others`, forecasts by the other radius-luminosity relations of the line. All of it
    comes from the trials that were made; other relations by giving these other weights.
    """
    at = table.layouts.index(layout)
    trials = int(table.trials[at])
    success = table.success[at, :trials]
    normals = np.array([normals_of(setting, prospect, trial) for trial in range(trials)])
    if not trials:
        return ()
    lag_z, amplitude_z, timescale_z = normals.T
    nights = _usable(setting, prospect, layout, trials)
    found = sensitivities(success, lag_z, amplitude_z, timescale_z, nights)
    return found + _relations(prospect.forecast, others, success, lag_z)


def _usable(setting: Setting, prospect: Prospect, layout: Layout, trials: int) -> Floats:
    """Return the usable nights in the layout's seasons, on the line's main telescope."""
    placing, line = place_in(prospect, layout), prospect.line[0]
    inside = np.zeros(line.night.size, dtype=bool)
    for first, last in zip(placing.first, placing.last, strict=True):
        inside |= (line.night >= first) & (line.night <= last)
    nights = line.night[inside]
    return np.array(
        [sky_of_trial(setting, t)[line.telescope][nights].sum() for t in range(trials)], dtype=float
    )


def _relations(
    expected: Forecast, others: Sequence[Forecast], success: Flags, lag_z: Floats
) -> tuple[Sensitivity, ...]:
    """Return the success with each other relation of the line."""
    found = []
    for other in others:
        shift = float(np.log10(other.lag_obs_d / expected.lag_obs_d))
        share, lo, hi, _ = reweighted(
            success, lag_z, shift, expected.lag_scatter_dex, other.lag_scatter_dex
        )
        found.append(Sensitivity("relation", other.relation, other.lag_obs_d, share, lo, hi))
    return tuple(found)
