"""The planner's result tables, one function each."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from astropy.table import Table

from planner.base.timescale import utc_text
from planner.export.columns import dates, rounded, significant, table_of
from planner.model.campaign import Campaign, Layout
from planner.model.plan import Plan, SiteSky, Visit
from planner.model.target import Forecast
from planner.model.trial import Prospect, Score
from planner.scoring import LayoutForecast
from planner.sky import airmass_of, moon_separation, positions_at

__all__ = [
    "forecast_table",
    "lags_table",
    "recommendation_table",
    "schedule_table",
    "scores_table",
    "seasons_table",
    "windows_table",
]


def lags_table(forecasts: Sequence[Forecast]) -> Table:
    """Return the expected lag, variability and mass of each target's line."""
    f = forecasts
    spread = np.array([10**x.lag_scatter_dex for x in f])
    lag = np.array([x.lag_obs_d for x in f])
    return table_of(
        [
            ("target", [x.name for x in f], None, "name"),
            ("line", [x.line for x in f], None, "broad emission line"),
            ("lag_rest", significant([x.lag_rest_d for x in f]), "d", "median, rest frame"),
            ("lag_obs", significant(lag), "d", "median, observed frame"),
            ("lag_obs_lo", significant(lag / spread), "d", "16th percentile, observed frame"),
            ("lag_obs_hi", significant(lag * spread), "d", "84th percentile, observed frame"),
            ("relation", [x.relation for x in f], None, "radius-luminosity relation"),
            (
                "outside_range",
                [x.outside_range for x in f],
                None,
                "luminosity outside the range in which the relation was calibrated",
            ),
            (
                "log_luminosity",
                rounded([x.log_luminosity for x in f], 2),
                "dex(erg s-1)",
                "log10 of lambda L_lambda of the AGN",
            ),
            (
                "wavelength",
                [x.luminosity_wavelength_a for x in f],
                "Angstrom",
                "rest wavelength of log_luminosity",
            ),
            (
                "amplitude",
                significant([x.amplitude_mag for x in f], 2),
                "mag",
                "median long-term rms of the AGN's light",
            ),
            (
                "timescale_obs",
                significant([x.timescale_obs_d for x in f], 2),
                "d",
                "median damping timescale, observed frame",
            ),
            ("log_mass", rounded([x.log_mass for x in f], 2), "dex(solMass)", "expected mass"),
            (
                "mass_dex",
                rounded([x.mass_dex for x in f], 2),
                "dex",
                "error of the mass to expect from the campaign",
            ),
        ]
    )


def windows_table(targets: Sequence[str], skies: dict[str, SiteSky]) -> Table:
    """Return every window of every target, site by site."""
    parts: dict[str, list[Any]] = {}
    for site, sky in skies.items():
        w, n = sky.windows, sky.nights
        part = {
            "target": np.asarray(targets, dtype=str)[w.target],
            "site": np.full(w.target.size, site),
            "night": dates(n.night[w.night]),
            "start_utc": utc_text(w.start_mjd),
            "end_utc": utc_text(w.end_mjd),
            "hours": rounded((w.end_mjd - w.start_mjd) * 24, 3),
            "airmass_min": rounded(w.airmass_min, 3),
            "moon_separation": rounded(w.moon_separation_deg, 1),
            "moon_illumination": rounded(w.moon_illumination, 3),
        }
        for name, values in part.items():
            parts.setdefault(name, []).append(values)
    describe = {
        "target": (None, "name"),
        "site": (None, "site of the window"),
        "night": (None, "local date of the evening"),
        "start_utc": (None, "start, UTC"),
        "end_utc": (None, "end, UTC"),
        "hours": ("h", "length"),
        "airmass_min": (None, "least airmass in the window"),
        "moon_separation": ("deg", "distance of the moon at least airmass"),
        "moon_illumination": (None, "illuminated fraction of the moon at least airmass"),
    }
    return table_of(
        [(name, np.concatenate(values), *describe[name]) for name, values in parts.items()]
    )


def seasons_table(campaign: Campaign, prospects: Sequence[Prospect]) -> Table:
    """Return every visible season of every target, for the line stream's telescope."""
    rows = [(p.forecast.name, s) for p in prospects for s in p.seasons]
    first = campaign.first_night
    return table_of(
        [
            ("target", np.array([name for name, _ in rows], dtype=str), None, "name"),
            (
                "first_night",
                dates(np.array([first + s.first for _, s in rows], dtype=int)),
                None,
                "local date of the first evening",
            ),
            (
                "last_night",
                dates(np.array([first + s.last for _, s in rows], dtype=int)),
                None,
                "local date of the last evening",
            ),
            ("nights", [s.nights for _, s in rows], None, "nights with a usable window"),
            (
                "gap_after",
                [s.gap_after_nights for _, s in rows],
                "d",
                "until the next season or the campaign's end",
            ),
        ]
    )


LAYOUT_COLUMNS = (
    ("cadence_line", "cadence_line_nights", "d", "between spectra"),
    ("cadence_continuum", "cadence_continuum_nights", "d", "between continuum epochs"),
    ("season_length", "season_length_d", "d", "of each season"),
    ("seasons", "seasons", None, "number of seasons"),
    ("shift", "shift_d", "d", "seasons start later than the best stretch"),
    ("exposure_line", "exposure_line", None, "exposure over that of the stream"),
    ("exposure_continuum", "exposure_continuum", None, "exposure over that of the stream"),
)


def layout_columns(layouts: Sequence[Layout | None]) -> list[tuple[str, Any, str | None, str]]:
    """Return the columns that say what a layout is; NaN where there is none."""
    return [
        (
            column,
            [getattr(x, name) if x else float("nan") for x in layouts],
            unit,
            words,
        )
        for column, name, unit, words in LAYOUT_COLUMNS
    ]


BOUND = "90 % confidence; holds whenever the trials were stopped"


def scores_table(scores: Sequence[Score]) -> Table:
    """Return what the trials say of every layout of every target."""
    s = scores

    def of(name: str, digits: int) -> Any:
        return rounded([getattr(x, name) for x in s], digits)

    return table_of(
        [
            ("target", np.array([x.target for x in s], dtype=str), None, "name"),
            *layout_columns([x.layout for x in s]),
            ("epochs_line", of("epochs_line", 1), None, "mean over weather"),
            ("epochs_continuum", of("epochs_continuum", 1), None, "mean over weather"),
            ("forecast", of("promise", 4), None, "success expected before any trial"),
            ("success", of("success", 4), None, "share of trials with a right claim"),
            ("success_lo", of("success_lo", 4), None, f"lower end, {BOUND}"),
            ("success_hi", of("success_hi", 4), None, f"upper end, {BOUND}"),
            ("false_claims", of("false_claims", 4), None, "share of trials with a wrong claim"),
            ("false_claims_hi", of("false_claims_hi", 4), None, f"upper end, {BOUND}"),
            ("hours", of("hours", 2), "h", "clock hours, both streams"),
            ("hours_line", of("hours_line", 2), "h", "clock hours, line stream"),
            ("hours_shutter", of("hours_shutter", 2), "h", "exposures alone"),
            ("trials", [x.trials for x in s], None, "0: not needed, or not possible: see note"),
            ("note", np.array([x.note for x in s], dtype=str), None, "what stands in the way"),
        ]
    )


def forecast_table(forecasts: Sequence[LayoutForecast]) -> Table:
    """Return the information forecast of every layout, the most promising of a target first."""
    f = forecasts
    return table_of(
        [
            ("target", np.array([x.target for x in f], dtype=str), None, "name"),
            *layout_columns([x.layout for x in f]),
            (
                "success",
                rounded([x.success for x in f], 3),
                None,
                "expected where variability and response are known",
            ),
            ("error", significant([x.error for x in f], 2), None, "least fractional lag error"),
            ("epochs_line", rounded([x.epochs_line for x in f], 1), None, "mean over weather"),
            ("hours", rounded([x.hours for x in f], 2), "h", "clock hours, both streams"),
        ]
    )


def recommendation_table(plan: Plan) -> Table:
    """Return the advised layout of each target, alone and in the schedule of all targets."""
    nan = float("nan")
    recommendations, executed = plan.recommendations, plan.executed

    def of(name: str, digits: int) -> Any:
        return rounded(
            [nan if r.score is None else float(getattr(r.score, name)) for r in recommendations],
            digits,
        )

    run = [executed.get(r.target) for r in recommendations]
    return table_of(
        [
            ("target", [r.target for r in recommendations], None, "name"),
            (
                "decision",
                [r.decision for r in recommendations],
                None,
                "observe: goal met; risky: goal missed, still scheduled; leave out: not scheduled",
            ),
            *layout_columns([r.score.layout if r.score else None for r in recommendations]),
            ("success", of("success", 4), None, "share of trials with a right claim, target alone"),
            ("success_lo", of("success_lo", 4), None, f"lower end, {BOUND}"),
            ("success_hi", of("success_hi", 4), None, f"upper end, {BOUND}"),
            ("false_claims", of("false_claims", 4), None, "share of trials with a wrong claim"),
            ("hours", of("hours", 2), "h", "clock hours to expect in average weather, alone"),
            ("hours_shutter", of("hours_shutter", 2), "h", "of these, exposures alone"),
            (
                "success_scheduled",
                rounded([nan if s is None else s.success for s in run], 4),
                None,
                "success on the nights that the schedule of all targets leaves under weather",
            ),
            (
                "success_scheduled_lo",
                rounded([nan if s is None else s.success_lo for s in run], 4),
                None,
                "lower end, 90 % confidence (Wilson)",
            ),
            (
                "epochs_line_scheduled",
                rounded([nan if s is None else s.epochs_line for s in run], 1),
                None,
                "line epochs that the schedule leaves, mean over weather",
            ),
            (
                "hours_scheduled",
                rounded([plan.hours_scheduled.get(r.target, 0.0) for r in recommendations], 4),
                "h",
                "clock hours charged by the schedule for clear skies; add up to those of time.ecsv",
            ),
            ("why", [r.why for r in recommendations], None, "reason in words"),
            (
                "helps",
                [
                    "; ".join(
                        f"{h.change}: {h.success:.0%} ({h.gain:+.0%}, {h.hours:+.0f} h)"
                        for h in r.helps
                    )
                    for r in recommendations
                ],
                None,
                "changes tried where the goal is missed",
            ),
        ]
    )


def schedule_table(campaign: Campaign, visits: Sequence[Visit]) -> Table:
    """Return every scheduled visit with where the telescope points and how the moon stands."""
    where = {t.name: t for t in campaign.targets}
    site = {t.name: t.site for t in campaign.telescopes}
    start = np.array([v.start_mjd for v in visits])
    end = np.array([v.end_mjd for v in visits])
    sky = {name: np.full(len(visits), np.nan) for name in ("airmass", "moon", "angle")}
    for place in campaign.sites:
        rows = np.array([site[v.telescope] == place.name for v in visits], dtype=bool)
        if rows.any():
            here = [where[v.target] for v, mine in zip(visits, rows, strict=True) if mine]
            ra = np.array([t.ra_deg for t in here])
            dec = np.array([t.dec_deg for t in here])
            middle = (start[rows] + end[rows]) / 2
            pointing = positions_at(ra, dec, place, middle)
            sky["airmass"][rows] = airmass_of(pointing.altitude_deg)
            sky["moon"][rows] = moon_separation(ra, dec, place, middle)
            sky["angle"][rows] = pointing.parallactic_angle_deg
    text = [
        (name, np.array([getattr(v, name) for v in visits], dtype=str), None, note)
        for name, note in (
            ("target", "name"),
            ("stream", "line or continuum"),
            ("telescope", "where it is taken"),
        )
    ]
    nights = np.array([campaign.first_night + v.night for v in visits], dtype=int)
    return table_of(
        [
            ("night", dates(nights), None, "local date of the evening"),
            *text,
            ("start_utc", utc_text(start), None, "start of slew, UTC"),
            ("end_utc", utc_text(end), None, "end of read-out, UTC"),
            ("exposure", [v.exposure_s for v in visits], "s", "shutter time"),
            ("airmass", rounded(sky["airmass"], 3), None, "at mid-visit"),
            ("moon_separation", rounded(sky["moon"], 1), "deg", "at mid-visit"),
            ("parallactic_angle", rounded(sky["angle"], 1), "deg", "at mid-visit"),
        ],
        note="Planned for clear skies: a visit lost to weather is taken on the next clear night. "
        "A plan is no permission: the observatory's own limits, sun avoidance, safety rules and "
        "staff decide.",
    )
