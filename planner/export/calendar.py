"""The schedule as a calendar that mail and phone programs import (iCalendar, RFC 5545)."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from typing import Any
from uuid import UUID, uuid5

from astropy.table import Table

from planner.base.timescale import date_of_night
from planner.export.write import as_rows
from planner.model.campaign import Campaign

__all__ = ["calendar"]

CAUTION = (
    "A plan is no permission: the observatory's own limits, sun avoidance, safety rules and staff "
    "decide. Planned for clear skies."
)
FOLD_OCTETS = 75
"""Longest line, its break not counted (RFC 5545, 3.1)."""

_OURS = UUID("6f1d3c52-8f0e-5f0b-9a53-0d2b3f7a41c6")
"""Name space of the events' identifiers; drawn once, never to be changed."""
_BREAKS = re.compile("\r\n|[\n\r\x85\u2028\u2029]")
_UNSEEN = re.compile("[\x00-\x09\x0b-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069\ud800-\udfff\ufeff]")
"""Control characters, characters that turn the direction of the text around them, halves of
characters, byte-order marks."""
_WORDS = {"line": "spectrum", "continuum": "image"}


def calendar(campaign: Campaign, schedule: Table, from_night: int | None = None) -> bytes:
    """Return the schedule as an iCalendar file, one event a visit.

    Parameters
    ----------
    campaign : Campaign
    schedule : Table
        From `planner.export.schedule_table`.
    from_night : int, optional
        MJD of the evening date from which this version of the schedule is planned; the campaign's
        first night if not given.

    Returns
    -------
    bytes
        UTF-8 text with CRLF line ends. Times are UTC, the same seconds as in the schedule's table.

    Notes
    -----
    An event is the same one as in an earlier file if campaign, target, stream, telescope and
    night have the same names: its UID is a name-based UUID of these (RFC 9562; advised by RFC
    7986, 5.3), so importing a newer version of a schedule moves visits and does not double them.
    Importing takes nothing away: a visit that the newer schedule drops stays until it is deleted,
    so give the campaign a calendar of its own, and empty that one first.

    Which version of an event wins is said by SEQUENCE, then by DTSTAMP (RFC 5546, 2.1.5: the higher
    SEQUENCE, of equal ones the later DTSTAMP). A plan must not depend on the day it is made, so
    both are taken from `from_night`: SEQUENCE is its MJD and DTSTAMP its 00:00 UTC. A schedule
    replanned from a later night beats all before it. Two versions from the same night are equal
    in both; of these, programs that import a file take the one imported last, for they refuse
    only a lower SEQUENCE (from memory), but one that follows RFC 5546 to the letter may keep what
    it has: there, delete the old events first.

    Events are TENTATIVE, and TRANSPARENT: it is the telescope that is busy, not the reader.
    """
    night = campaign.first_night if from_night is None else from_night
    stamp = date_of_night(night).replace("-", "") + "T000000Z"
    lines = [
        "BEGIN:VCALENDAR",
        "VERSION:2.0",
        "PRODID:-//reverberation-planner//schedule//EN",
        "CALSCALE:GREGORIAN",
        f"X-WR-CALNAME:{text(campaign.name)}",
    ]
    for row in as_rows(schedule):
        lines += _event(campaign, row, stamp, night)
    lines.append("END:VCALENDAR")
    return b"".join(folded(line) for line in lines)


def _event(campaign: Campaign, row: dict[str, Any], stamp: str, sequence: int) -> list[str]:
    what = _WORDS[row["stream"]]
    minutes = f"{row['exposure'] / 60:.3g}"
    name = [campaign.name, row["target"], row["stream"], row["telescope"], row["night"]]
    return [
        "BEGIN:VEVENT",
        f"UID:{uuid5(_OURS, json.dumps(name))}",
        f"DTSTAMP:{stamp}",
        f"SEQUENCE:{sequence}",
        f"DTSTART:{_stamp(row['start_utc'])}",
        f"DTEND:{_stamp(row['end_utc'])}",
        f"SUMMARY:{text(row['target'])}: {what}\\, {text(row['telescope'])} {minutes} min",
        f"LOCATION:{text(campaign.site(row['telescope']).name)}",
        f"DESCRIPTION:{text(_description(row))}",
        f"CATEGORIES:{text(row['target'])}",
        "STATUS:TENTATIVE",
        "TRANSP:TRANSPARENT",
        "END:VEVENT",
    ]


def _description(row: dict[str, Any]) -> str:
    said = [f"{row['target']}, {row['stream']}, {row['telescope']}, night of {row['night']}"]
    for key, words, unit in (
        ("exposure", "exposure", " s"),
        ("airmass", "airmass", ""),
        ("moon_separation", "distance of the moon", " deg"),
        ("parallactic_angle", "parallactic angle", " deg"),
    ):
        if row[key] is not None:
            said.append(f"{words} {row[key]:g}{unit}")
    return "\n".join([*said, CAUTION])


def _stamp(utc: str) -> str:
    """Return ``YYYYMMDDTHHMMSSZ`` of ``YYYY-MM-DDTHH:MM:SSZ``."""
    return utc.replace("-", "").replace(":", "")


def text(value: str) -> str:
    r"""Return a value of type TEXT: ``\ ; ,`` and line breaks escaped, control characters gone."""
    value = _UNSEEN.sub("", _BREAKS.sub("\n", value))
    for mark in ("\\", ";", ","):
        value = value.replace(mark, "\\" + mark)
    return value.replace("\n", "\\n")


def folded(line: str) -> bytes:
    """Return a line in pieces of at most 75 octets, no character split, CRLF after each piece."""
    return b"\r\n ".join(_pieces(line)) + b"\r\n"


def _pieces(line: str) -> Iterator[bytes]:
    rest, room = line.encode(), FOLD_OCTETS
    while len(rest) > room:
        cut = room
        while rest[cut] & 0xC0 == 0x80:  # inside a character of UTF-8
            cut -= 1
        yield rest[:cut]
        rest, room = rest[cut:], FOLD_OCTETS - 1  # a space opens each piece but the first
    yield rest
