"""Checks of what each telescope of a stream is asked to do."""

from __future__ import annotations

from collections.abc import Iterator

from planner.base.quantities import in_unit
from planner.campaign.parts import Parts
from planner.campaign.settle import KINDS, Choices, stream_of
from planner.campaign.sheet import Sheet
from planner.campaign.stream_schema import AUTO, WANTED, ContinuumSection, FeedSection
from planner.campaign.streams import usual_floor
from planner.campaign.yaml_nodes import Place

__all__ = ["check_feeds", "feeds_of"]


def feeds_of(parts: Parts) -> Iterator[tuple[Place, FeedSection]]:
    """Yield every telescope's part in a stream, with its place in the file."""
    for kind in KINDS:
        section = stream_of(parts, kind)
        if section is not None:
            yield ("streams", kind), section
            for i, other in enumerate(getattr(section, "also", ())):
                yield ("streams", kind, "also", i), other


def check_feeds(sheet: Sheet, parts: Parts, choices: Choices) -> None:
    """Note in `sheet` what cannot go together."""
    taken: set[tuple[str, str]] = set()
    for path, feed in feeds_of(parts):
        if len(path) > 2 and feed.telescope is None:
            sheet.fault((*path, "telescope"), "missing", "the telescope that joins the stream")
        telescope = choices.telescope_of.get(sheet.key(path))
        if telescope is not None:
            if (str(path[1]), telescope.name) in taken:
                found = f"{telescope.name} a second time in this stream"
                sheet.fault((*path, "telescope"), found, "each telescope once")
            taken.add((str(path[1]), telescope.name))
        _check_instrument(sheet, path, feed)
        _check_exposure(sheet, path, feed, parts)
        _check_visit(sheet, path, feed, parts, choices)
    continuum = stream_of(parts, "continuum")
    if isinstance(continuum, ContinuumSection) and continuum.source == "spectra":
        for key in sorted(continuum.model_fields_set - {"source"}):
            sheet.fault(
                ("streams", "continuum", key),
                "not used, the continuum is measured in the spectra alone",
                "`source: both` to add images, or no such key",
            )


def _check_instrument(sheet: Sheet, path: Place, feed: FeedSection) -> None:
    full = "camera" if hasattr(feed, "camera") else "spectrograph"
    described = getattr(feed, full)
    if described is None:
        return
    if feed.signal_to_noise is not None:
        found = f"both `signal_to_noise` and `{full}`"
        sheet.fault((*path, full), found, "one of the two")
    if full == "spectrograph" and (described.slit is None) == (described.fibre is None):
        found = "neither `slit` nor `fibre`" if described.slit is None else "both slit and fibre"
        sheet.fault((*path, full), found, "the width of a slit, such as `slit: 2 arcsec`")


def _check_exposure(sheet: Sheet, path: Place, feed: FeedSection, parts: Parts) -> None:
    if feed.exposure != AUTO:
        for key in ("wanted_error", "longest_exposure"):
            if getattr(feed, key) is not None:
                sheet.fault((*path, key), "a fixed exposure", "`exposure: auto`, or no such key")
        return
    stream = stream_of(parts, str(path[1]))
    assert stream is not None, "it holds this feed"
    floor, wanted = feed.floor, feed.wanted_error
    if floor is None:
        floor = in_unit(usual_floor(stream)[0], "", "")
    if wanted is None:
        wanted = in_unit(WANTED[str(path[1])], "", "")
    if wanted <= floor:
        sheet.fault(
            (*path, "wanted_error"),
            f"{100 * wanted:g} % with a floor of {100 * floor:g} %",
            "an error above the calibration floor, which no exposure beats",
        )


def _check_visit(
    sheet: Sheet, path: Place, feed: FeedSection, parts: Parts, choices: Choices
) -> None:
    """Refuse visits that do not fit into a night's allotment."""
    key = sheet.key(path)
    telescope = choices.telescope_of.get(key)
    time = telescope.time or parts.time if telescope else None
    if telescope is None or time is None or isinstance(feed.exposure, str):
        return
    spent = feed.exposure + feed.exposures * feed.read_out + feed.overhead
    hours = (spent + telescope.slew + telescope.acquisition) / 3600
    limits = [h for h in (time.hours_per_night, time.hours) if h is not None]
    if limits and hours > min(limits):
        found = (
            f"a visit takes {hours:.3g} h with overhead and slew, "
            f"and {telescope.name} is ours for {min(limits):g} h"
        )
        sheet.fault((*path, "exposure"), found, "a shorter exposure or more time")
