import re
import unicodedata
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from uuid import UUID, uuid5

import icalendar
import numpy as np
import pytest
import vobject
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.export import calendar, schedule_table
from planner.export.calendar import folded, text


def events(raw):
    """Read a calendar with two libraries; return (uid, start, end, summary, target) from each."""
    one = [
        (str(e["UID"]), e.start, e.end, str(e["SUMMARY"]), str(e["CATEGORIES"].cats[0]))
        for e in icalendar.Calendar.from_ical(raw).walk("VEVENT")
    ]
    two = [
        (e.uid.value, e.dtstart.value, e.dtend.value, e.summary.value, e.categories.value[0])
        for e in vobject.readOne(raw.decode()).vevent_list
    ]
    return one, two


def when(utc):
    return datetime.strptime(utc, "%Y-%m-%dT%H:%M:%S%z")


def plain(name):
    """What a program shows of a name: without the marks that turn the direction of the text."""
    return name.replace("\u202e", "").replace("\u202c", "")


def test_two_libraries_read_every_visit_at_its_second(month):
    for found in events(calendar(month.campaign, month.schedule)):
        assert len(found) == len(month.visits) > 50
        for (_, start, end, summary, target), row in zip(found, month.schedule, strict=True):
            assert start == when(row["start_utc"])
            assert start.utcoffset() == end.utcoffset() == timedelta(0)
            assert end == when(row["end_utc"])
            assert target == row["target"]
            what = "spectrum, Big 20 min" if row["stream"] == "line" else "image, Small 5 min"
            assert summary == f"{row['target']}: {what}"


def test_hostile_names_stay_text(hostile):
    raw = calendar(hostile.campaign, hostile.schedule)
    assert raw.count(b"BEGIN:VEVENT\r\n") == raw.count(b"END:VEVENT\r\n") == len(hostile.visits)
    for found in events(raw):
        assert [e[4] for e in found] == [plain(v.target) for v in hostile.visits]
        assert [e[3].split(": ")[0] for e in found] == [plain(v.target) for v in hostile.visits]


def test_an_event_holds_what_an_observer_needs(month):
    event = next(
        iter(icalendar.Calendar.from_ical(calendar(month.campaign, month.schedule)).walk("VEVENT"))
    )
    row = month.schedule[0]
    told = str(event["DESCRIPTION"])
    assert event["LOCATION"] == "Ridge"
    assert event["TRANSP"] == "TRANSPARENT"
    assert f"exposure {row['exposure']:g} s" in told
    assert f"airmass {row['airmass']:g}" in told
    assert f"distance of the moon {row['moon_separation']:g} deg" in told
    assert f"parallactic angle {row['parallactic_angle']:g} deg" in told
    assert "no permission" in told


def test_no_event_leaves_its_window(month):
    offered = {(r.target, r.telescope): r.nights for r in month.requests}
    found, _ = events(calendar(month.campaign, month.schedule))
    epoch = datetime(1858, 11, 17, tzinfo=UTC)
    for (_, start, end, *_), visit in zip(found, month.visits, strict=True):
        nights = offered[visit.target, visit.telescope]
        (row,) = np.flatnonzero(nights.night == visit.night)
        # both are rounded to the second, which keeps their order
        first, last = (
            epoch + timedelta(seconds=round(edge[row] * 86400))
            for edge in (nights.window_start_mjd, nights.window_end_mjd)
        )
        assert first <= start < end <= last


def test_a_newer_schedule_updates_and_does_not_double(month):
    """The same night's visit keeps its UID wherever it stands in the list and whenever it is."""
    first, _ = events(calendar(month.campaign, month.schedule))
    assert len({uid for uid, *_ in first}) == len(first)
    moved = [
        replace(v, start_mjd=v.start_mjd + 0.002, end_mjd=v.end_mjd + 0.002, exposure_s=99.0)
        for v in month.visits[:0:-1]
    ]
    second, _ = events(calendar(month.campaign, schedule_table(month.campaign, moved)))
    assert [uid for uid, *_ in second] == [uid for uid, *_ in first[:0:-1]]
    assert all(new[1] != old[1] for new, old in zip(second, first[:0:-1], strict=True))
    other, _ = events(calendar(replace(month.campaign, name="Other"), month.schedule))
    assert not {uid for uid, *_ in other} & {uid for uid, *_ in first}


def test_the_uid_is_the_same_for_ever(month):
    """Calendars out there hold these: a change doubles every event of every user."""
    visit = replace(month.visits[0], night=0, target="One", stream="line", telescope="Big")
    ((uid, *_),), _ = events(calendar(month.campaign, schedule_table(month.campaign, [visit])))
    name = '["Small", "One", "line", "Big", "2027-03-01"]'
    assert uid == str(uuid5(UUID("6f1d3c52-8f0e-5f0b-9a53-0d2b3f7a41c6"), name))


def test_a_schedule_from_a_later_night_wins(month):
    """The higher SEQUENCE wins, of equal ones the later DTSTAMP (RFC 5546, 2.1.5)."""

    def version(**options):
        raw = calendar(month.campaign, month.schedule, **options)
        return {
            (e["SEQUENCE"], e["DTSTAMP"].dt)
            for e in icalendar.Calendar.from_ical(raw).walk("VEVENT")
        }

    ((sequence, stamp),) = version()
    ((later, later_stamp),) = version(from_night=month.campaign.first_night + 40)
    assert (sequence, stamp) == (61465, datetime(2027, 3, 1, tzinfo=UTC))
    assert later > sequence
    assert later_stamp == datetime(2027, 4, 10, tzinfo=UTC)


def test_the_same_schedule_gives_the_same_bytes(month):
    assert calendar(month.campaign, month.schedule) == calendar(month.campaign, month.schedule)


def check_lines(raw):
    """Check line ends and folds byte by byte; return the unfolded lines."""
    assert raw.endswith(b"\r\n")
    assert b"\r" not in raw.replace(b"\r\n", b"")
    assert b"\n" not in raw.replace(b"\r\n", b"")
    lines = raw[:-2].split(b"\r\n")
    for line in lines:
        assert 0 < len(line) <= 75
        line.decode()  # no character is split
        assert not any(byte < 32 or byte == 127 for byte in line)
    return raw[:-2].replace(b"\r\n ", b"").split(b"\r\n")


def test_lines_are_folded_byte_by_byte(hostile):
    lines = check_lines(calendar(hostile.campaign, hostile.schedule))
    assert all(b":" in line for line in lines)


@pytest.mark.parametrize("octets", [74, 75, 76, 149, 150, 224])
@pytest.mark.parametrize("character", ["a", "é", "م", "\U0001f52d"])
def test_folds_fall_where_they_must(octets, character):
    line = "x" * (octets % len(character.encode())) + character * (
        octets // len(character.encode())
    )
    raw = folded(line)
    pieces = raw[:-2].split(b"\r\n ")
    assert b"".join(pieces).decode() == line
    # as long as the characters let them be
    for piece in pieces[:-1]:
        assert 74 - len(character.encode()) < len(piece) <= 75
    assert len(pieces) >= -(-(octets - 1) // 74)


def seen(value):
    """What must come back of any text: no control characters, no turned directions."""
    lines = re.split("\r\n|[\n\r\x85\u2028\u2029]", value)
    return "\n".join(
        "".join(
            c
            for c in line
            if unicodedata.category(c) not in {"Cc", "Cs"}
            and unicodedata.bidirectional(c) not in TURNING
            and c != "\ufeff"
        )
        for line in lines
    )


TURNING = {"LRE", "RLE", "PDF", "LRO", "RLO", "LRI", "RLI", "FSI", "PDI"}


@given(st.text(max_size=300))
@settings(max_examples=300, deadline=None)
def test_any_text_comes_back_without_control_characters(value):
    (unfolded,) = check_lines(folded("X-NOTE:" + text(value)))
    escaped = unfolded.decode().removeprefix("X-NOTE:")
    assert not re.search(r"(?<!\\)(\\\\)*[;,]", escaped)  # none without its backslash
    assert re.sub(r"\\(.)", lambda m: {"n": "\n"}.get(m[1], m[1]), escaped) == seen(value)


@given(st.text(st.characters(exclude_categories=["C", "Z"]), min_size=1, max_size=80))
@settings(max_examples=60, deadline=None)
def test_any_name_is_read_alike_by_both_libraries(rename, name):
    month = rename(name, name + " 2")
    rows = month.schedule[:2]
    for found in events(calendar(month.campaign, rows)):
        assert [e[4] for e in found] == list(rows["target"])
