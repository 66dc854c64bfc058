"""A plain float of a record says its unit in its name, unless it has none."""

import dataclasses
import inspect
import types
from typing import get_args, get_type_hints

import numpy as np
import pytest

from planner.model import campaign, observatory, plan, sky, target, trial

UNITS = (
    "_d", "_s", "_deg", "_mjd", "_mag", "_dex", "_nights", "_a", "_m", "_km_s",
    "_arcsec", "_e", "_e_s", "_fwhm", "_hours",
    "_km_s_mpc", "_per_night",
)  # fmt: skip
PURE = {
    "omega_matter", "goal", "within", "error_below", "r_max_above", "sigma_above", "responsivity",
    "response_width", "clear_fraction", "hours", "hours_line", "signal_to_noise", "sky_share",
    "floor", "airmass", "airmass_min", "reference_airmass", "success", "success_lo", "success_hi",
    "gain", "moon_illumination", "moon_up_fraction", "redshift", "log_luminosity", "log_mass",
    "host_fraction", "priority", "iron_strength", "agn_fraction", "flux_error", "r_max",
    "epochs_line", "epochs_continuum", "claims", "false_claims", "false_claims_lo",
    "false_claims_hi", "throughput", "obstruction", "technical_loss", "read_share", "wanted_error",
    "moon_illumination_max", "scale_error", "hours_shutter", "hours_per_night", "whole_nights",
    "least_hours_per_night", "in_peak_above", "false_alarm_below", "r_unrelated", "promise",
    "share", "gain_lo", "gain_hi", "value", "lags", "lags_lo", "lags_hi", "spent", "deepen",
    "exposure_line", "exposure_continuum", "prospects",
}  # fmt: skip
RECORDS = [
    record
    for module in (campaign, observatory, plan, sky, target, trial)
    for _, record in inspect.getmembers(module, dataclasses.is_dataclass)
    if record.__module__ == module.__name__
]


def holds_floats(hint):
    if hint is float:
        return True
    if isinstance(hint, types.UnionType) or getattr(hint, "__origin__", None) is tuple:
        return any(holds_floats(part) for part in get_args(hint))
    return "float64" in str(hint) and getattr(hint, "__origin__", None) is np.ndarray


@pytest.mark.parametrize("record", RECORDS, ids=lambda record: record.__name__)
def test_every_float_of_a_record_names_its_unit(record):
    floats = [name for name, hint in get_type_hints(record).items() if holds_floats(hint)]
    assert [n for n in floats if n not in PURE and not n.endswith(UNITS)] == []
    lags = [n for n in floats if n.startswith(("lag_", "timescale_"))]
    if record is target.Target or record is target.Forecast:
        assert [n for n in lags if n.endswith("_d") and not n.endswith(("_rest_d", "_obs_d"))] == []
