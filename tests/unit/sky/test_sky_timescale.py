"""Time scales and texts, and no dependence on today's date or the network."""

import os
import subprocess
import sys
import warnings
from pathlib import Path

import erfa
import numpy as np
import pytest
from astropy.time import Time
from astropy.utils import iers

import planner
from planner.base.timescale import (
    UT1_NOTE,
    date_of_night,
    night_of_date,
    offline,
    tt_of_utc,
    utc_text,
)


def test_terrestrial_time_follows_the_leap_seconds():
    """TAI - UTC: 10 s in 1972, 36 s until 2016, 37 s from 2017 (IERS Bulletin C 52)."""
    given = tt_of_utc([41317.0, 57753.5, 57754.0, 61000.0, 69000.0]) * 86400
    utc = np.array([41317.0, 57753.5, 57754.0, 61000.0, 69000.0]) * 86400
    np.testing.assert_allclose(given - utc, np.array([10, 36, 37, 37, 37]) + 32.184, atol=1e-5)


def test_terrestrial_time_equals_astropys():
    mjd = np.random.default_rng(0).uniform(41400, 68000, 500)
    with offline():
        theirs = Time(mjd, format="mjd", scale="utc").tt.mjd
    # on a day that ends in a leap second astropy stretches the day: one second at most
    np.testing.assert_allclose(tt_of_utc(mjd), theirs, rtol=0, atol=1e-9)


def test_dates_before_leap_seconds_are_refused():
    with pytest.raises(ValueError, match="before 1972"):
        tt_of_utc(41316.9)


@pytest.mark.parametrize(
    ("date", "mjd"), [("1858-11-17", 0), ("2000-01-01", 51544), ("2027-03-01", 61465)]
)
def test_nights_have_dates(date, mjd):
    assert night_of_date(date) == mjd
    assert date_of_night(mjd) == date
    assert night_of_date(date_of_night(mjd + 365)) == mjd + 365


def test_texts_round_to_the_nearest_second_across_midnight_and_year():
    second = 1 / 86400
    assert utc_text(61465.0) == "2027-03-01T00:00:00Z"
    assert utc_text(61465.0 - 0.4 * second) == "2027-03-01T00:00:00Z"
    assert utc_text(61465.0 - 0.6 * second) == "2027-02-28T23:59:59Z"
    assert utc_text(61771.0 - 0.1 * second) == "2028-01-01T00:00:00Z"
    assert utc_text(61830.5) == "2028-02-29T12:00:00Z"


def test_texts_keep_the_shape_and_leave_unknown_times_empty():
    given = utc_text(np.array([[61465.25, np.nan]]))
    assert given.tolist() == [["2027-03-01T06:00:00Z", ""]]
    assert utc_text(np.nan) == ""
    assert utc_text(np.empty(0)).shape == (0,)


def test_ut1_is_utc_at_any_date_inside_the_block_and_settings_come_back_after_it():
    before = (iers.conf.auto_download, iers.conf.auto_max_age, iers.earth_orientation_table.get())
    with offline():
        for mjd in (50000.0, 61000.0, 68000.0):
            time = Time(mjd, format="mjd", scale="utc")
            assert abs((time.ut1.mjd - mjd) * 86400) < 1e-5
            table = iers.earth_orientation_table.get()
            assert [abs(x.value) for x in table.pm_xy(time)] == [0.0, 0.0]
    after = (iers.conf.auto_download, iers.conf.auto_max_age, iers.earth_orientation_table.get())
    assert before == after


def test_only_the_expected_warnings_are_silenced():
    with offline():
        Time("2044-01-01", scale="utc").tai  # noqa: B018 the property converts and would warn
        with pytest.raises(UserWarning, match="other"):
            warnings.warn("other", UserWarning, stacklevel=1)
        with pytest.raises(erfa.ErfaWarning, match="distance"):
            erfa.pmsafe(0.0, 0.0, 0.0, 0.0, -1.0, 0.0, 2451545.0, 0.0, 2451545.0, 1.0)


def test_the_note_says_what_was_done():
    assert "UT1 is taken equal to UTC" in UT1_NOTE


PROGRAM = """
import datetime, socket, sys, time

def refuse(*args, **kwargs):
    raise RuntimeError("network")

socket.socket.connect = socket.getaddrinfo = socket.create_connection = refuse
shift = float(sys.argv[1]) * 86400
if shift:
    clock, stamp = time.time, time.time_ns
    time.time = lambda: clock() + shift
    time.time_ns = lambda: stamp() + int(shift * 1e9)

    class Later(datetime.datetime):
        @classmethod
        def now(cls, tz=None):
            return datetime.datetime.fromtimestamp(time.time(), tz)

        @classmethod
        def utcnow(cls):
            return cls.now(datetime.timezone.utc).replace(tzinfo=None)

    datetime.datetime = Later

from planner.base.timescale import offline
from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.sky import constraints, nights_at, observer, positions_at, seasons_of, windows_of

AIR = (WeatherClimate((1.0,) * 12, 2.0), SkyQuality(1.2, (), ()))
site = Site("here", -30.4, -70.9, 2300.0, None, *AIR)
limits = Limits(2.0, -18.0, 30.0)
nights = nights_at(site, 67900, 67999, limits)
windows = windows_of([10.0, 200.0], [-30.0, 0.0], site, nights, limits)
print(repr(nights), repr(windows), seasons_of(windows, nights))
print(positions_at(10.0, -30.0, site, 68000.0))

from astropy.coordinates import SkyCoord
from astropy.time import Time

with offline():
    times = Time(windows.best_mjd[:20], format="mjd")
    targets = SkyCoord([10.0] * 20, [-30.0] * 20, unit="deg")
    for rule in constraints(limits):
        print(rule.compute_constraint(times, observer(site), targets))
    print(observer(site).altaz(times, targets).alt.deg)
    print((Time.now().mjd - 40587 - time.time() / 86400) * 86400 < 60)
"""


def answer_with_clock(days, folder):
    environment = {**os.environ, "PYTHONPATH": str(Path(planner.__file__).parents[1])}
    environment |= {"XDG_CONFIG_HOME": str(folder), "XDG_CACHE_HOME": str(folder)}
    (folder / "astropy").mkdir(exist_ok=True)
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", PROGRAM, str(days)],
        env=environment,
        capture_output=True,
        text=True,
        check=False,
    )
    assert (done.returncode, done.stderr) == (0, "")
    return done.stdout


def test_a_clock_years_ahead_changes_nothing_and_asks_no_network(tmp_path):
    assert answer_with_clock(5500, tmp_path) == answer_with_clock(0, tmp_path)
