import re
from dataclasses import replace
from datetime import datetime
from html.parser import HTMLParser
from zoneinfo import ZoneInfo

import ephem
import numpy as np
import pytest
from astropy.time import Time

from planner.base.timescale import offline, utc_text
from planner.export import night_sheets
from planner.export.airmass_track import HEIGHT, WIDTH, ticks, track
from planner.export.night_sheet import clock_of, moon_words, sidereal_text
from planner.export.standards import STANDARDS
from planner.scoring import observe_sky

EMPTY = {"meta", "link", "br", "rect", "path", "polyline", "circle"}
IMPLIED = {"th", "td", "tr"}


class Sheets(HTMLParser):
    """The pages: each a list of tables, each a list of rows of cells; and which tags there are."""

    def __init__(self, raw):
        super().__init__()
        self.pages, self.tags, self.words, self.open = [], set(), [], []
        self.feed(raw.decode())

    def handle_starttag(self, tag, attributes):
        self.tags.add(tag)
        if tag not in EMPTY | IMPLIED:
            self.open.append(tag)
        if tag == "section":
            self.pages.append([])
            self.words.append("")
        elif tag == "table":
            self.pages[-1].append([])
        elif tag == "tr":
            self.pages[-1][-1].append([])
        elif tag in {"td", "th"}:
            self.pages[-1][-1][-1].append("")

    def handle_endtag(self, tag):
        if tag not in EMPTY | IMPLIED:
            assert self.open.pop() == tag

    def handle_data(self, data):
        if self.pages:
            self.words[-1] += data
        if "table" in self.open and data.strip():
            self.pages[-1][-1][-1][-1] += data


@pytest.fixture(scope="module")
def sheets(month):
    return Sheets(night_sheets(month.campaign, month.skies, month.visits))


def test_one_page_a_night_with_its_visits_in_time_order(month, sheets):
    nights = sorted({v.night for v in month.visits})
    assert len(sheets.pages) == len(nights)
    assert not sheets.open
    for night, (visits, *_), words in zip(nights, sheets.pages, sheets.words, strict=True):
        mine = [v for v in month.visits if v.night == night]
        mine.sort(key=lambda v: v.start_mjd)
        assert [r[3] for r in visits[1:]] == [v.target for v in mine]
        assert [r[8] for r in visits[1:]] == [f"{v.exposure_s:g}" for v in mine]
        starts = [round(v.start_mjd * 1440) % 1440 for v in mine]
        assert [r[0][:5] for r in visits[1:]] == [f"{m // 60:02d}:{m % 60:02d}" for m in starts]
        assert "no permission" in words
        assert all("\n" not in cell.strip() for row in visits for cell in row)


def test_airmass_moon_and_angle_are_those_of_the_schedule(month, sheets):
    rows = [row for page in sheets.pages for row in page[0][1:]]
    told = sorted(month.schedule, key=lambda r: (r["night"], r["start_utc"], r["telescope"]))
    for row, wanted in zip(rows, told, strict=True):
        assert row[3] == wanted["target"]
        start, middle, end = (float(x) for x in row[9].split())
        assert middle == pytest.approx(wanted["airmass"], abs=0.0051)
        assert min(start, end) - 0.02 < middle < max(start, end) + 0.02
        assert float(row[10]) == pytest.approx(wanted["moon_separation"], abs=0.551)
        assert float(row[11]) == pytest.approx(wanted["parallactic_angle"], abs=0.551)


def test_standards_stand_beside_spectra_alone(month, sheets):
    nights = sorted({v.night for v in month.visits})
    names = {s.name for s in STANDARDS}
    for night, page in zip(nights, sheets.pages, strict=True):
        spectra = [v.target for v in month.visits if v.night == night and v.stream == "line"]
        tables = [t for t in page if t[0][0] == "spectrum of"]
        assert len(tables) == bool(spectra)
        for table in tables:
            assert {row[0] for row in table[1:]} == set(spectra)
            assert {row[2] for row in table[1:]} <= names
            assert all(float(row[6]) <= 2.0 for row in table[1:])


def test_backups_are_up_and_not_visited(month):
    night = month.visits[0].night
    alone = [v for v in month.visits if v.night == night and v.target == "One"]
    assert alone
    (page,) = Sheets(night_sheets(month.campaign, month.skies, alone)).pages
    (backup,) = (t[1:] for t in page if "magnitude" in t[0])
    assert [row[0] for row in backup] == ["Two"]
    assert backup[0][3] == "15.5 V"
    windows = month.skies["Ridge"].windows
    mine = np.flatnonzero((windows.night == night) & (windows.target == 1))
    edges = utc_text(np.round(windows.start_mjd[mine] * 1440) / 1440)
    assert [span[:5] for span in backup[0][5].split(", ")] == [e[11:16] for e in edges]


def test_hostile_names_stay_text(hostile, sheets):
    raw = night_sheets(hostile.campaign, hostile.skies, hostile.visits)
    found = Sheets(raw)
    assert found.tags == sheets.tags
    assert "script" not in found.tags
    told = [row[3] for page in found.pages for row in page[0][1:]]
    assert sorted(told) == sorted(v.target for v in hostile.visits)


def test_the_page_asks_for_nothing(month):
    raw = night_sheets(month.campaign, month.skies, month.visits).decode()
    assert not re.search(r"(?:src|href)\s*=|url\(|@import|https?:", raw)


def test_each_site_has_pages_of_its_own(month):
    """The second site lies a quarter of the Earth east, and its clock is its own."""
    first = month.campaign.sites[0]
    second = replace(first, name="Far", longitude_deg=first.longitude_deg + 90.0)
    big, small = month.campaign.telescopes
    campaign = replace(
        month.campaign,
        sites=(first, second),
        telescopes=(big, replace(small, site="Far")),
        last_night=month.campaign.first_night + 12,
    )
    visits = [
        v if v.telescope == "Big" else replace(v, start_mjd=v.start_mjd - 0.25,
                                               end_mjd=v.end_mjd - 0.25)
        for v in month.visits if v.night <= 12
    ]  # fmt: skip
    found = Sheets(night_sheets(campaign, observe_sky(campaign), visits))
    wanted = sorted({(v.night, campaign.site(v.telescope).name == "Far") for v in visits})
    for (_, far), page, words in zip(wanted, found.pages, found.words, strict=True):
        assert {row[7] for row in page[0][1:]} == {"Small" if far else "Big"}
        assert f", {'Far' if far else 'Ridge'}" in words
        assert f"UTC{'+1' if far else '-5'} h by the longitude" in words


def test_no_visits_are_said(month):
    assert b"No visits are scheduled." in night_sheets(month.campaign, month.skies, [])


def test_the_size_of_four_hundred_nights_is_kept(month):
    """Of pages with as many visits as these."""
    raw = night_sheets(month.campaign, month.skies, month.visits)
    bare = night_sheets(month.campaign, month.skies, [])
    nights = len({v.night for v in month.visits})
    assert len(bare) + 400 * (len(raw) - len(bare)) / nights < 5e6


def test_each_drawing_has_a_title_and_a_track_for_each_target(month):
    raw = night_sheets(month.campaign, month.skies, month.visits).decode()
    drawings = re.findall(r'<svg class="track" role="img".*?</svg>', raw, re.DOTALL)
    nights = sorted({v.night for v in month.visits})
    assert len(drawings) == len(nights)
    for night, drawing in zip(nights, drawings, strict=True):
        assert re.search(
            r"<title>Airmass of the targets of 2027-\d\d-\d\d over UTC</title>", drawing
        )
        targets = {v.target for v in month.visits if v.night == night}
        spectra = [v for v in month.visits if v.night == night and v.stream == "line"]
        assert len(re.findall(r'stroke-width="1.5"', drawing)) == len(targets)
        assert len(re.findall(r'stroke-width="6"', drawing)) == len(spectra)
        for x, y in re.findall(r"(-?\d+),(-?\d+)", drawing):
            assert -1 <= int(x) <= WIDTH + 1
            assert 0 <= int(y) <= HEIGHT + 2


def test_a_track_breaks_where_a_target_is_too_low():
    share = np.linspace(0, 1, 6)
    lines = track(share, np.array([1.0, 1.5, 3.0, np.inf, 2.0, 1.2]), 2.0)
    assert lines == ["0,0 200,75", "800,150 1000,30"]
    assert track(share, np.full(6, np.inf), 2.0) == []


def test_ticks_are_whole_hours_inside_the_night():
    hours, marks = ticks(61465.0 + 23.5 / 24, 61466.0 + 3.0 / 24, 2.0)
    assert [h["hour"] for h in hours] == [0, 1, 2, 3]
    assert [h["x"] for h in hours] == [143, 429, 714, 1000]
    assert [(m["airmass"], m["y"]) for m in marks] == [("1", 0), ("1.5", 75), ("2", 150)]
    for limit in (1.05, 1.2, 1.5, 3.0, 10.0):
        heights = [m["y"] for m in ticks(0.0, 0.3, limit)[1]]
        assert heights == sorted(set(heights))
        assert heights[-1] == HEIGHT


def test_the_clock_is_the_sites_zone_with_its_summer_time(month):
    site = replace(month.campaign.sites[0], time_zone="America/Santiago")
    campaign = replace(month.campaign, sites=(site,))
    found = Sheets(night_sheets(campaign, month.skies, month.visits))
    zone = ZoneInfo("America/Santiago")
    by_start = sorted(month.visits, key=lambda v: (v.night, v.start_mjd))
    rows = [row for page in found.pages for row in page[0][1:]]
    for row, visit in zip(rows, by_start, strict=True):
        utc = utc_text(round(visit.start_mjd * 1440) / 1440)
        local = datetime.strptime(utc, "%Y-%m-%dT%H:%M:%S%z").astimezone(zone)
        assert row[1][:5] == f"{local:%H:%M}"
    assert all("Local times: America/Santiago." in words for words in found.words)


@pytest.mark.parametrize(
    ("zone", "words"), [(None, "no time zone is given"), ("Nowhere/Here", "is not known")]
)
def test_without_a_zone_the_longitude_gives_the_hour_and_it_is_said(site, zone, words):
    clock, told = clock_of(replace(site, time_zone=zone))
    assert clock.utcoffset(None).total_seconds() == -5 * 3600  # -70.9 deg / 15 = -4.7
    assert "UTC-5 h by the longitude" in told
    assert words in told


@pytest.mark.parametrize("mjd", [51544.5, 61465.123, 62000.9])
def test_sidereal_time_agrees_with_astropy(site, mjd):
    with offline():
        time = Time(mjd, format="mjd", scale="utc")
        hours = time.sidereal_time("mean", longitude=site.longitude_deg).hour
    told = sidereal_text(site, mjd)
    minutes = int(told[:2]) * 60 + int(told[3:])
    assert abs((minutes - hours * 60 + 720) % 1440 - 720) <= 0.51


def test_moonrise_and_moonset_agree_with_an_independent_library(month, sheets):
    """PyEphem's rising and setting of the moon's centre without refraction, to two minutes."""
    site = month.campaign.sites[0]
    place = ephem.Observer()
    place.lon, place.lat = np.radians(site.longitude_deg), np.radians(site.latitude_deg)
    place.elevation, place.pressure, place.horizon = 0.0, 0.0, 0.0
    dark = month.skies["Ridge"].nights
    compared = 0
    for night, words in zip(sorted({v.night for v in month.visits}), sheets.words, strict=True):
        for verb, hour, minute in re.findall(r"(rises|sets) (\d\d):(\d\d) UTC", words):
            place.date = dark.dark_start_mjd[night] - 15019.5
            find = place.next_rising if verb == "rises" else place.next_setting
            at = float(find(ephem.Moon(), use_center=True)) + 15019.5
            told = (int(hour) * 60 + int(minute)) / 1440
            assert abs((told - at + 0.5) % 1 - 0.5) * 1440 < 2
            compared += 1
    assert compared > 10


def test_the_moon_is_told_in_words():
    mjd = np.linspace(61465.0, 61465.5, 97)
    assert moon_words(mjd, np.full(97, 5.0), mjd[0], mjd[-1]) == "up all night"
    assert moon_words(mjd, np.full(97, -5.0), mjd[0], mjd[-1]) == "below the horizon all night"
    line = np.linspace(-10.0, 30.0, 97)
    assert moon_words(mjd, line, mjd[0], mjd[-1]) == (
        "rises 03:00 UTC, 3.0 h after dark begins and 9.0 h before it ends"
    )
