"""Checks across sections: what cannot go together."""

from __future__ import annotations

from planner.campaign.check_feeds import check_feeds, feeds_of
from planner.campaign.parts import Parts
from planner.campaign.schema import Months, TimeSection
from planner.campaign.sections import nearest
from planner.campaign.settle import Choices
from planner.campaign.sheet import Sheet
from planner.campaign.yaml_nodes import Place

__all__ = ["check"]

_LONGEST_NIGHTS = 7305
_YEAR_D = 365.25


def check(sheet: Sheet, parts: Parts, choices: Choices) -> None:
    """Note in `sheet` everything that cannot go together."""
    _check_dates(sheet, parts)
    _check_references(sheet, parts)
    _check_weather(sheet, parts)
    _check_candidates(sheet, parts, choices)
    check_feeds(sheet, parts, choices)


def _check_dates(sheet: Sheet, parts: Parts) -> None:
    programme = parts.programme
    if programme is not None:
        nights = programme.last_night - programme.first_night + 1
        path: Place = ("campaign", "last_night")
        if nights < 1:
            sheet.fault(path, "before first_night", "the two dates the other way round")
        elif nights > _LONGEST_NIGHTS:
            sheet.fault(path, f"a campaign of {nights / _YEAR_D:.0f} years", "at most 20 years")
    times: list[tuple[Place, TimeSection | None]] = [(("time",), parts.time)]
    times += [((*place, "time"), t.time) for place, t in parts.telescopes.items() if t]
    for path, time in times:
        for i, blocked in enumerate(time.blocked if time else ()):
            first, last = blocked.run()
            if last < first:
                sheet.fault((*path, "blocked", i), "`to` before `from`", "the dates in order")


def _check_references(sheet: Sheet, parts: Parts) -> None:
    sites = [s.name for s in parts.known_sites()]
    complete = bool(sites) and len(sites) == len(parts.sites)
    for path, telescope in parts.telescopes.items():
        if telescope is None or not complete:
            continue
        if telescope.site is None and len(sites) > 1:
            sheet.fault((*path, "site"), "missing", f"one of {', '.join(sites)}")
        elif telescope.site is not None and telescope.site not in sites:
            _unknown(sheet, (*path, "site"), telescope.site, sites, "site")
    names = [t.name for t in parts.known_telescopes()]
    if not names or len(names) < len(parts.telescopes):
        return
    for path, feed in feeds_of(parts):
        if feed.telescope is not None and feed.telescope not in names:
            _unknown(sheet, (*path, "telescope"), feed.telescope, names, "telescope")


def _unknown(sheet: Sheet, path: Place, name: str, known: list[str], kind: str) -> None:
    guess = nearest(name, known)
    hint = f"; did you mean `{guess}`?" if guess else ""
    listed = "" if guess else f"one of {', '.join(known)}"
    sheet.fault(path, f"unknown {kind} `{name}`{hint}", listed)


def _check_weather(sheet: Sheet, parts: Parts) -> None:
    """Refuse bad spells too short for so much lost time.

    With a share p of clear nights and bad spells of mean length b, clear spells have the mean
    length b p / (1 - p), which is at least one night. A month without any clear night needs none.
    """
    for path, site in parts.sites.items():
        if site is None:
            continue
        months = zip(site.weather.clear.fractions(), Months.model_fields, strict=True)
        usable = [(share, month) for share, month in months if share > 0]
        worst, month = min(usable, key=lambda pair: pair[0], default=(1.0, ""))
        least = (1 - worst) / worst
        if site.weather.bad_spell < least - 1e-9:
            found = (
                f"bad spells of {site.weather.bad_spell:g} nights cannot fill the "
                f"{100 * (1 - worst):g} % lost in {month}"
            )
            expected = f"at least {least:.3g} nights, or more clear nights"
            sheet.fault((*path, "weather", "bad_spell"), found, expected)


def _check_candidates(sheet: Sheet, parts: Parts, choices: Choices) -> None:
    programme = parts.programme
    nights = programme.last_night - programme.first_night + 1 if programme else 0
    lengths = choices.season_lengths or (1.0,)
    shortest, longest = lengths[0], lengths[-1]
    if nights > 0 and longest > nights:
        found = f"a season of {longest:g} d in a campaign of {nights} nights"
        sheet.fault(("season_lengths",), found, "seasons no longer than the campaign")
    most = max(choices.seasons, default=1)
    # The first season may lie at the end of a target's visibility, the last at its beginning.
    if most > 1 and 0 < nights < (most - 2) * _YEAR_D + 2 * shortest:
        found = f"{most} seasons of {shortest:g} d in a campaign of {nights} nights"
        sheet.fault(("seasons",), found, "fewer seasons or a later last_night")
    for kind, cadences in choices.cadences.items():
        if choices.season_lengths and max(cadences, default=1.0) > shortest:
            found = f"a cadence of {cadences[-1]:g} nights in a season of {shortest:g} d"
            path = ("streams", kind, "cadence")
            sheet.fault(path, found, "cadences no longer than the shortest season")
