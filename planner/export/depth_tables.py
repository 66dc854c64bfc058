"""Tables of what one visit measures and what the whole schedule costs."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from astropy.table import Table

from planner.agn import LINES
from planner.export.columns import rounded, significant, table_of
from planner.model.plan import Opinion, TimeSpent
from planner.model.trial import FeedNights, Prospect

__all__ = ["epochs_table", "opinions_table", "time_table"]


def epochs_table(prospects: Sequence[Prospect]) -> Table:
    """Return what one visit of each telescope to each target measures, at median conditions."""
    told = [
        (p, kind, nights)
        for p in prospects
        for kind, feeds in (("line", p.line), ("continuum", p.continuum))
        for nights in feeds
    ]
    rows = [(p.forecast.name, kind, nights) for p, kind, nights in told]

    def median(name: str) -> list[float]:
        return [
            float(np.median(getattr(n, name))) if n.night.size else float("nan") for _, _, n in rows
        ]

    return table_of(
        [
            ("target", np.array([name for name, _, _ in rows], dtype=str), None, "name"),
            ("stream", np.array([kind for _, kind, _ in rows], dtype=str), None, "light curve"),
            ("telescope", np.array([n.telescope for _, _, n in rows], dtype=str), None, "name"),
            ("nights", [n.night.size for _, _, n in rows], None, "nights on which a visit fits"),
            ("exposure", [n.exposure_s for _, _, n in rows], "s", "shutter time of one epoch"),
            (
                "visit",
                rounded([n.visit_s / 3600 for _, _, n in rows], 4),
                "h",
                "clock time of one epoch, without standard stars",
            ),
            (
                "signal_to_noise",
                significant(median("signal_to_noise")),
                None,
                "images: of the flux; spectra: of the continuum per pixel (per angstrom where a "
                "known case was given)",
            ),
            (
                "flux_error",
                significant(median("flux_error")),
                None,
                "fractional, calibration included; of the band or the line",
            ),
            ("airmass", rounded(median("airmass"), 2), None, "median of the best times"),
            (
                "sky",
                rounded(median("sky_ab_mag"), 2),
                "mag / arcsec2",
                "AB, median of the best times",
            ),
            (
                "note",
                np.array([_note(p, kind, n) for p, kind, n in told], dtype=str),
                None,
                "what stands out",
            ),
        ]
    )


OPTICAL_A = (3300.0, 10500.0)
"""Wavelengths that silicon detectors on the ground reach (common practice, no source)."""
FAINT = 0.5
"""Flux error beyond which an epoch says next to nothing (our choice)."""


def _note(prospect: Prospect, kind: str, nights: FeedNights) -> str:
    notes = []
    if nights.in_spectra_of is not None:
        notes.append("comes with the line's spectra")
    if not nights.reached:
        notes.append("the longest exposure does not reach the wanted error")
    forecast = prospect.forecast
    observed_a = LINES[forecast.line].wavelength_rest_a * forecast.lag_obs_d / forecast.lag_rest_d
    if kind == "line" and not OPTICAL_A[0] <= observed_a <= OPTICAL_A[1]:
        notes.append(f"{forecast.line} lies at {observed_a:.0f} A, out of an optical reach")
    if nights.night.size and np.median(nights.flux_error) > FAINT:
        notes.append("too faint: one epoch says next to nothing")
    return "; ".join(notes)


def opinions_table(opinions: Sequence[Opinion]) -> Table:
    """Return the recommended layouts tried in other ways."""
    o = opinions
    return table_of(
        [
            ("target", np.array([x.target for x in o], dtype=str), None, "name"),
            (
                "what",
                np.array([x.what for x in o], dtype=str),
                None,
                "other recovery method, line unrelated to the continuum, or a disturbance",
            ),
            ("success", rounded([x.success for x in o], 4), None, "share of right claims"),
            ("success_lo", rounded([x.success_lo for x in o], 4), None, "90 % confidence (Wilson)"),
            ("success_hi", rounded([x.success_hi for x in o], 4), None, "90 % confidence (Wilson)"),
            (
                "false_claims",
                rounded([x.false_claims for x in o], 4),
                None,
                "share of wrong claims",
            ),
            (
                "false_claims_hi",
                rounded([x.false_claims_hi for x in o], 4),
                None,
                "90 % confidence (Wilson)",
            ),
            ("trials", [x.trials for x in o], None, "simulated campaigns"),
        ]
    )


def time_table(spent: Sequence[TimeSpent]) -> Table:
    """Return the schedule's clock time by telescope and stream, for clear skies."""
    hours = [
        ("shutter_hours", "exposures alone"),
        ("visit_hours", "slews, acquisition, exposures, read-out and overhead"),
        ("standards_hours", "standard stars"),
        ("minimum_hours", "charged for nights shorter than the telescope's least"),
        ("clock_hours", "visits, standard stars and what is charged besides"),
    ]
    return table_of(
        [
            ("telescope", np.array([s.telescope for s in spent], dtype=str), None, "name"),
            ("stream", np.array([s.stream for s in spent], dtype=str), None, "light curve"),
            ("visits", [s.visits for s in spent], None, "scheduled for clear skies"),
            ("nights", [s.nights for s in spent], None, "on which the telescope is used"),
            *(
                (name, rounded([getattr(s, name) for s in spent], 4), "h", words)
                for name, words in hours
            ),
            (
                "whole_nights",
                rounded([s.whole_nights for s in spent], 2),
                None,
                "clock hours over the mean dark hours of a night",
            ),
        ]
    )
