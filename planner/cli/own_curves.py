"""The command for an observer's own light curves: recover."""

from __future__ import annotations

from argparse import Namespace

from planner.base.errors import InputError
from planner.cli.shared import say, say_json
from planner.cli.terminal import significant

__all__ = ["recover"]

LAGS, RESAMPLES = 961, 1000
"""Trial lags and resamples: more than in trials, for these curves are recovered but once."""


def recover(options: Namespace) -> int:
    """Print the lag of an observer's own two light curves."""
    import numpy as np

    from planner.base.seeds import stream
    from planner.campaign import read_light_curve
    from planner.recovery import lag_grid, recover_lag, search_range

    continuum, line = read_light_curve(options.continuum), read_light_curve(options.line)
    times = np.concatenate([continuum.time_d, line.time_d])
    duration = float(np.ptp(times))
    if duration == 0:
        raise InputError(f"{options.continuum}: all epochs of both curves are at one time")
    # Nothing is known of this AGN, so every lag is searched that leaves a third of the data.
    grid = lag_grid(*search_range(duration, duration, 2 * duration), 1.0, LAGS)
    result = recover_lag(*continuum, *line, grid, RESAMPLES, stream(options.seed or 0, "recover"))
    if options.json:
        names = ("lag_d", "lag_lo_d", "lag_hi_d", "r_max", "peak_d", "share")
        values = {name: float(getattr(result, name)) for name in names}
        finite = {name: value if np.isfinite(value) else None for name, value in values.items()}
        say_json(finite | {"reason": result.reason})
    elif result.reason:
        say(f"no lag: {result.reason}")
    else:
        say(
            f"lag {significant(result.lag_d, 3)} d, 68 % interval "
            f"{significant(result.lag_lo_d, 3)} to {significant(result.lag_hi_d, 3)} d "
            f"(observed frame), peak correlation {result.r_max:.2f}"
        )
    return 0
