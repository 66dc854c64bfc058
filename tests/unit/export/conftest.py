"""A month of the small campaign, really scheduled."""

from dataclasses import replace
from types import SimpleNamespace

import pytest

from planner.export import schedule_table
from planner.model.campaign import Layout
from planner.pipeline import forecast_targets, prospects_of
from planner.schedule import planned, requests_of
from planner.scoring import observe_sky

HOSTILE = (
    "<script>alert('x')</script>&amp;",
    '=HYPERLINK("http://x","y"), a; b\\n',
    "مرحبا بالعالم",
    "\u202egnol\u202c \U0001f52d\U0001f469\u200d\U0001f680 Érable" + " very long" * 40,
)


def scheduled(campaign):
    """Return campaign, skies, requests, visits and the schedule's table."""
    skies = observe_sky(campaign)
    prospects = prospects_of(campaign, forecast_targets(campaign), skies)
    requests = requests_of(campaign, [(p, Layout(3.0, 1.0, 25.0, 1)) for p in prospects])
    visits, _ = planned(campaign, requests)
    return SimpleNamespace(
        campaign=campaign,
        skies=skies,
        requests=requests,
        visits=visits,
        schedule=schedule_table(campaign, visits),
    )


@pytest.fixture(scope="session")
def month(campaign):
    return scheduled(replace(campaign, last_night=campaign.first_night + 30))


def renamed(month, names):
    """Return the month with its two targets called otherwise."""
    new = dict(zip(("One", "Two"), names, strict=True))
    campaign = replace(
        month.campaign,
        targets=tuple(replace(t, name=new[t.name]) for t in month.campaign.targets),
    )
    visits = [replace(v, target=new[v.target]) for v in month.visits]
    requests = tuple(replace(r, target=new[r.target]) for r in month.requests)
    return SimpleNamespace(
        campaign=campaign,
        skies=month.skies,
        requests=requests,
        visits=visits,
        schedule=schedule_table(campaign, visits),
    )


@pytest.fixture(scope="session", params=[HOSTILE[:2], HOSTILE[2:]], ids=["markup", "scripts"])
def hostile(month, request):
    return renamed(month, request.param)


@pytest.fixture(scope="session")
def rename(month):
    return lambda *names: renamed(month, names)
