from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.model.campaign import Layout
from planner.model.observatory import TimeAllotment
from planner.model.sky import Season
from planner.model.trial import Prospect
from planner.schedule import assign, planned, requests_of, used_nights


@pytest.fixture
def two(campaign, forecast, nights):
    """Both targets of the small campaign, wanting spectra every 3 nights for 120."""
    seasons = (Season(0, 0, 180, 181, 0),)
    prospects = [
        Prospect(
            replace(forecast, name=name),
            (nights(181),),
            (nights(181, visit_s=420.0, telescope="Small"),),
            seasons,
            "",
        )
        for name in ("One", "Two")
    ]
    return campaign, [(p, Layout(3, 1, 120, 1)) for p in prospects]


def with_time(campaign, **time):
    telescopes = tuple(replace(t, time=TimeAllotment(**time)) for t in campaign.telescopes)
    return replace(campaign, telescopes=telescopes)


def faults(campaign, requests, visits):
    """Return everything a schedule must never do, checked without the scheduler's own code."""
    offered = {(r.target, r.stream): r for r in requests}
    found = []
    by_telescope = {}
    for v in visits:
        r = offered[v.target, v.stream]
        row = np.flatnonzero(r.nights.night == v.night)
        if row.size != 1:
            found.append(f"{v}: no window that night")
            continue
        if v.start_mjd < r.nights.window_start_mjd[row[0]] - 1e-9:
            found.append(f"{v}: before its window")
        if v.end_mjd > r.nights.window_end_mjd[row[0]] + 1e-9:
            found.append(f"{v}: after its window")
        if abs((v.end_mjd - v.start_mjd) * 86400 - r.nights.visit_s) > 1e-3:
            found.append(f"{v}: not a whole visit")
        if not any(a <= v.night <= b for a, b in zip(r.first, r.last, strict=True)):
            found.append(f"{v}: outside its season")
        by_telescope.setdefault(v.telescope, []).append(v)
    for name, booked in by_telescope.items():
        booked.sort(key=lambda v: v.start_mjd)
        found += [
            f"{a} overlaps {b}" for a, b in pairwise(booked) if b.start_mjd < a.end_mjd - 2e-9
        ]
        time = campaign.telescope(name).time
        hours = {}
        for v in booked:
            hours[v.night] = hours.get(v.night, 0) + (v.end_mjd - v.start_mjd) * 24
        if time.hours is not None and sum(hours.values()) > time.hours + 1e-6:
            found.append(f"{name}: {sum(hours.values())} h")
        if time.nights is not None and len(hours) > time.nights:
            found.append(f"{name}: {len(hours)} nights")
        if time.hours_per_night is not None and max(hours.values()) > time.hours_per_night + 1e-6:
            found.append(f"{name}: {max(hours.values())} h in a night")
    return found


def test_with_room_for_all_every_cadence_is_kept(two):
    campaign, chosen = two
    requests = requests_of(campaign, chosen)
    visits, unplaced = planned(campaign, requests)
    assert unplaced == []
    assert faults(campaign, requests, visits) == []
    lines = [v.night for v in visits if v.stream == "line" and v.target == "One"]
    assert len(lines) == 40
    assert set(np.diff(lines)) == {3}


def test_visits_sit_at_least_airmass_where_they_can(two):
    campaign, chosen = two
    requests = requests_of(campaign, chosen[:1])
    nights = requests[0].nights
    for v in assign(campaign, requests[:1]):
        middle = (v.start_mjd + v.end_mjd) / 2
        assert middle == pytest.approx(nights.best_mjd[nights.night == v.night][0], abs=1e-6)


def test_no_visit_falls_on_a_lost_night(two):
    campaign, chosen = two
    requests = requests_of(campaign, chosen)
    visits = assign(campaign, requests, dict.fromkeys(("Big", "Small"), np.arange(181) % 5 != 0))
    assert visits
    assert all(v.night % 5 for v in visits)


@pytest.mark.parametrize(
    ("time", "reached"),
    [({"hours": 10.0}, 20), ({"nights": 12}, 24), ({"hours_per_night": 0.6}, 80)],
)
def test_allotments_are_kept_and_shortfalls_said(two, time, reached):
    campaign, chosen = two
    campaign = with_time(campaign, **time)
    requests = requests_of(campaign, chosen)
    visits, unplaced = planned(campaign, requests)
    assert faults(campaign, requests, visits) == []
    assert sum(v.stream == "line" for v in visits) == pytest.approx(reached, abs=1)
    if reached < 80:
        assert {u.target for u in unplaced} == {"One", "Two"}
        assert all(u.placed < u.wanted for u in unplaced)


def test_the_more_overdue_goes_first(two):
    campaign, chosen = two
    campaign = with_time(campaign, hours_per_night=0.6)  # one spectrum a night
    requests = [r for r in requests_of(campaign, chosen) if r.stream == "line"]
    requests[1] = replace(requests[1], cadence_nights=12.0)
    visits = assign(campaign, requests, {"Big": np.arange(181) > 8})
    assert visits[0].target == "One"
    assert visits[1].target == "Two"


def test_priority_breaks_the_tie(two):
    campaign, chosen = two
    campaign = with_time(campaign, hours_per_night=0.6)
    requests = [r for r in requests_of(campaign, chosen) if r.stream == "line"]
    requests[1] = replace(requests[1], priority=2.0)
    assert assign(campaign, requests)[0].target == "Two"


def test_used_nights_are_those_of_the_visits(two):
    campaign, chosen = two
    requests = requests_of(campaign, chosen)
    visits = assign(campaign, requests)
    for request, used in zip(requests, used_nights(requests, visits), strict=True):
        mine = [v.night for v in visits if (v.target, v.stream) == (request.target, request.stream)]
        assert request.nights.night[used].tolist() == mine


@settings(max_examples=60, deadline=None)
@given(data=st.data())
def test_any_campaign_gives_a_schedule_without_faults(data, campaign, forecast, nights):
    draw = data.draw
    telescope = draw(st.sampled_from(["Big", "Small"]))
    feeds = (replace(campaign.continuum.feeds[0], telescope=telescope),)
    campaign = replace(campaign, continuum=replace(campaign.continuum, feeds=feeds))
    campaign = with_time(
        campaign,
        hours=draw(st.none() | st.floats(0.1, 40)),
        nights=draw(st.none() | st.integers(1, 40)),
        hours_per_night=draw(st.none() | st.floats(0.1, 3)),
    )
    chosen = []
    for name in ("One", "Two"):
        keep = np.sort(draw(st.lists(st.integers(0, 60), min_size=1, max_size=60, unique=True)))
        season = Season(0, int(keep[0]), int(keep[-1]), keep.size, 0)
        visit = draw(st.sampled_from([300.0, 1800.0, 5400.0, 10800.0]))
        prospect = Prospect(
            replace(forecast, name=name),
            (nights(61, keep=keep, visit_s=visit),),
            (nights(61, keep=keep, visit_s=420.0, telescope=telescope),),
            (season,),
            "",
        )
        length = draw(st.sampled_from([10.0, 30.0, 60.0]))
        chosen.append((prospect, Layout(draw(st.sampled_from([1.0, 2.5, 6.0])), 1.0, length, 1)))
    requests = requests_of(campaign, chosen)
    visits, unplaced = planned(campaign, requests)
    assert faults(campaign, requests, visits) == []
    for u in unplaced:
        assert u.placed == sum((v.target, v.stream) == (u.target, u.stream) for v in visits)
