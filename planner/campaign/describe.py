"""What was understood of a campaign, in words for the screen and as plain data for JSON."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import asdict
from datetime import date
from typing import Any

from planner.campaign.fields import MJD_OF_DATE_ZERO
from planner.campaign.read import Reading
from planner.model.campaign import Campaign
from planner.model.observatory import (
    Camera,
    Feed,
    KnownCase,
    Site,
    Stream,
    Telescope,
    TimeAllotment,
)
from planner.model.target import Target

__all__ = ["as_dict", "describe"]

_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")


def describe(reading: Reading) -> str:
    """Return the campaign as text, section by section, each with the defaults that it took."""
    campaign = reading.campaign
    blocks: list[tuple[str, Iterator[str], tuple[str, ...]]] = [
        (
            f"Campaign {campaign.name}",
            _programme(campaign),
            ("campaign", "season_lengths", "seasons", "season_shifts", "time"),
        ),
        *((f"Site {s.name}", _site(s), ("site", f"sites.{s.name}")) for s in campaign.sites),
        *(
            (f"Telescope {t.name}", _telescope(t), (f"telescopes.{t.name}",))
            for t in campaign.telescopes
        ),
        *(
            (f"Stream {s.kind}", _stream(s), (f"streams.{s.kind}",))
            for s in (campaign.continuum, campaign.line)
        ),
        ("Rules", _rules(campaign), ("limits", "success", "simulation", "cosmology", "relations")),
        (f"Targets ({len(campaign.targets)})", map(_target, campaign.targets), ("targets",)),
        ("Notes", iter(reading.notes), ()),
        ("Files read", map(str, reading.files), ()),
    ]
    lines: list[str] = []
    for title, said, keys in blocks:
        defaults = [
            f"default: {d.key} = {d.value} ({d.reason})"
            for d in reading.defaults
            if any(d.key == key or d.key.startswith(f"{key}.") for key in keys)
        ]
        inside = [f"  {line}" for line in (*said, *defaults)]
        lines += [title, *inside] if inside else []
    return "\n".join(lines)


def as_dict(reading: Reading) -> dict[str, Any]:
    """Return the reading as dicts, lists, text and numbers; nights as ISO evening dates."""
    campaign = asdict(reading.campaign)
    for key in ("first_night", "last_night"):
        campaign[key] = _date(campaign[key])
    for telescope in campaign["telescopes"]:
        time = telescope["time"]
        time["blocked"] = [[_date(night) for night in run] for run in time["blocked"]]
    return {
        "campaign": campaign,
        "defaults": [asdict(default) for default in reading.defaults],
        "notes": list(reading.notes),
        "files": [str(file) for file in reading.files],
    }


def _programme(campaign: Campaign) -> Iterator[str]:
    nights = campaign.last_night - campaign.first_night + 1
    yield f"nights: {_date(campaign.first_night)} to {_date(campaign.last_night)} ({nights})"
    yield f"seed: {campaign.seed}"
    yield f"season lengths: {_candidates(campaign.season_lengths_d, ' d')}"
    yield f"numbers of seasons: {_candidates(campaign.seasons)}"
    if campaign.season_shifts_d != (0.0,):
        yield f"seasons start later by: {_candidates(campaign.season_shifts_d, ' d')}"


def _candidates(values: Sequence[float], unit: str = "") -> str:
    return ", ".join(f"{v:g}{unit}" for v in values) or "generated for each target"


def _site(site: Site) -> Iterator[str]:
    yield f"latitude {site.latitude_deg:g} deg, longitude {site.longitude_deg:g} deg, east positive"
    yield f"elevation {site.elevation_m:g} m, time zone {site.time_zone or 'not given'}"
    clear = site.weather.clear_fraction
    if len(set(clear)) == 1:
        months = f"{100 * clear[0]:g} %"
    else:
        months = ", ".join(f"{m} {100 * p:g} %" for m, p in zip(_MONTHS, clear, strict=True))
    yield f"seeing {site.sky.seeing_arcsec:g} arcsec"
    for words, pairs in (("dark sky", site.sky.dark_mag), ("extinction", site.sky.extinction_mag)):
        yield f"{words}: {', '.join(f'{band} {value:g}' for band, value in pairs)}"
    yield f"clear nights: {months}; bad spells of {site.weather.bad_spell_nights:g} nights"


def _telescope(telescope: Telescope) -> Iterator[str]:
    yield (
        f"{telescope.aperture_m:g} m at {telescope.site}, obstruction "
        f"{100 * telescope.obstruction:g} %, slew {_time(telescope.slew_s)}, acquisition "
        f"{_time(telescope.acquisition_s)}, {100 * telescope.technical_loss:g} % technical loss"
    )
    yield f"time: {_time_limits(telescope.time) or 'every night, all night'}"


def _time_limits(time: TimeAllotment) -> str:
    limits = [
        f"{time.hours:g} h in all" if time.hours is not None else "",
        f"{time.nights} nights" if time.nights is not None else "",
        f"{time.hours_per_night:g} h a night" if time.hours_per_night is not None else "",
        f"at least {time.least_hours_per_night:g} h charged a night"
        if time.least_hours_per_night
        else "",
        *(f"not {_date(first)} to {_date(last)}" for first, last in time.blocked),
    ]
    return ", ".join(filter(None, limits))


def _stream(stream: Stream) -> Iterator[str]:
    yield f"candidate cadences: {_candidates(stream.cadence_nights, ' d')}"
    if stream.deepen != (1.0,):
        yield f"candidate exposures: {_candidates(stream.deepen, ' times')} those below"
    if stream.in_spectra:
        yield "measured in the line's spectra, whose scale error it shares"
    for feed in stream.feeds:
        yield f"telescope {feed.telescope}"
        yield from (f"  {line}" for line in _feed(feed, stream.kind))
    time = _time_limits(stream.time)
    if time:
        yield f"time of this stream: {time}"
    if stream.measurement:
        beside, narrow = stream.measurement.continuum_window_a, stream.measurement.narrow_width_a
        yield f"continuum beside the line from {_or(beside, 'as much as the line takes')}"
        if narrow:
            yield f"scaled with narrow lines of equivalent width {narrow:g} A"


def _or(width_a: float | None, otherwise: str) -> str:
    return otherwise if width_a is None else f"{width_a:g} A in all"


def _feed(feed: Feed, kind: str) -> Iterator[str]:
    known = feed.instrument
    if feed.exposure_s is None:
        yield (
            f"exposure for an error of {100 * feed.wanted_error:g} %, at most "
            f"{_time(feed.longest_s)}, in {_frames(feed.exposures)}"
        )
    else:
        yield f"exposure {_time(feed.exposure_s)} in {_frames(feed.exposures)}"
    yield (
        f"read-out {_time(feed.read_out_s)} a frame, overhead {_time(feed.overhead_s)} a visit, "
        f"standard stars {_time(feed.standards_s)} a night"
    )
    if isinstance(known, KnownCase):
        per = " per angstrom" if kind == "line" else ""
        share = "estimated" if known.sky_share is None else f"{100 * known.sky_share:g} %"
        yield (
            f"signal-to-noise {known.signal_to_noise:g}{per} at {known.band} = "
            f"{known.magnitude_mag:g} in {_time(known.exposure_s)}, airmass {known.airmass:g}, "
            f"sky share {share}"
        )
    elif isinstance(known, Camera):
        yield (
            f"camera in {known.band}: throughput {100 * known.throughput:g} %, pixel "
            f"{known.pixel_arcsec:g} arcsec, read noise {known.read_noise_e:g} e, aperture radius "
            f"{known.aperture_fwhm:g} seeing widths"
        )
    else:
        opening = "fibre" if known.fibre else "slit"
        yield (
            f"spectrograph: throughput {100 * known.throughput:g} %, {known.dispersion_a:g} A a "
            f"pixel, resolution {known.resolution_a:g} A, {opening} {known.slit_arcsec:g} arcsec"
        )
    most = _moon(feed.moon_illumination_max)
    yield f"floor {100 * feed.floor:g} %, moon {most}"


def _moon(most: float) -> str:
    """Return a moon limit in words."""
    return "any" if most >= 1 else f"down, or at most {100 * most:g} % illuminated"


def _frames(count: int) -> str:
    return "one frame" if count == 1 else f"{count} frames"


def _rules(campaign: Campaign) -> Iterator[str]:
    limits, rule, draw = campaign.limits, campaign.success, campaign.simulation
    yield (
        f"limits: airmass {limits.airmass:g}, sun below {limits.sun_altitude_deg:g} deg, moon "
        f"farther than {limits.moon_separation_deg:g} deg"
    )
    yield f"goal: success in {100 * rule.goal:g} % of trials, within {100 * rule.within:g} %"
    yield (
        f"claim: error below {100 * rule.error_below:g} %, r_max above {rule.r_max_above:g}, lag "
        f"above {rule.sigma_above:g} sigma, more than {100 * rule.in_peak_above:g} % in the "
        f"primary peak, chance of a false alarm below {100 * rule.false_alarm_below:g} %"
        f"{', correlation and likelihood agree' if rule.agree else ''}"
    )
    if rule.robust_to:
        yield f"tried under disturbances too: {', '.join(rule.robust_to)}"
    least, most = draw.response_width
    yield (
        f"simulation: {draw.trials} trials, {draw.resamples} resamples, responsivity "
        f"{draw.responsivity:g}, method {draw.method}{', detrended' if draw.detrend else ''}, "
        f"response width {100 * least:g} to {100 * most:g} % of the lag"
    )
    yield (
        f"cosmology: H0 {campaign.cosmology.hubble_km_s_mpc:g} km/s/Mpc, Omega_m "
        f"{campaign.cosmology.omega_matter:g}"
    )
    named = [f"{line} {key}" for line, key in campaign.relations if key]
    if named:
        yield f"relations: {', '.join(named)}"


def _target(target: Target) -> str:
    parts = [f"{target.name}: {target.ra_deg:.5f} {target.dec_deg:+.5f} deg, z {target.redshift:g}"]
    if target.magnitude:
        parts.append(f"{target.magnitude.band} {target.magnitude.value_mag:g}")
    if target.log_luminosity:
        parts.append("log L{} {:g}".format(*target.log_luminosity))
    given = {
        "": target.line,
        "host": target.host_fraction,
        "E(B-V)": target.ebv_mag or None,
        "width [km/s]": target.line_width_km_s,
        "equivalent width [A]": target.line_equivalent_width_a,
        "log mass": target.log_mass,
        "amplitude [mag]": target.amplitude_mag,
        "timescale [d, rest]": target.timescale_rest_d,
        "lag [d, rest]": target.lag_rest_d,
        "priority": target.priority if target.priority != 1 else None,
        "iron": target.iron_strength,
    }
    for label, value in given.items():
        if value is not None:
            parts.append(f"{label} {value:g}" if isinstance(value, float) else str(value))
    return ", ".join([*parts, *([target.notes] if target.notes else [])])


def _date(night: int) -> str:
    return date.fromordinal(night + MJD_OF_DATE_ZERO).isoformat()


def _time(seconds: float) -> str:
    for unit, size in (("h", 3600), ("min", 60)):
        if seconds >= size:
            return f"{seconds / size:g} {unit}"
    return f"{seconds:g} s"
