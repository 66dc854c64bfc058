"""Windows hold the limits inside and break them outside, whatever the site, target and limits."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.model.observatory import Limits, Site, SkyQuality, WeatherClimate
from planner.sky import moon_separation, nights_at, positions_at, sun_moon_at, windows_of

MARGIN_DEG = 0.05
"""Grazing moons may be overlooked by this much; for everything else a tenth would do."""

sites = st.builds(
    lambda latitude, longitude: Site(
        "here",
        latitude,
        longitude,
        1000.0,
        None,
        WeatherClimate((1.0,) * 12, 2.0),
        SkyQuality(1.2, (), ()),
    ),
    st.floats(-90, 90),
    st.floats(-180, 180),
)
limits_drawn = st.builds(
    Limits, st.floats(1.05, 6.0), st.sampled_from([-6.0, -12.0, -18.0]), st.floats(0, 120)
)
first_nights = st.integers(58000, 68300)
right_ascensions = st.floats(0, 360)
declinations = st.floats(-90, 90)


def excess(site, limits, ra, dec, mjd):
    """By how many degrees the limits are kept (negative: broken) at each time."""
    altitude = positions_at(ra, dec, site, mjd).altitude_deg
    sky = sun_moon_at(site, mjd)
    moon = np.maximum(
        moon_separation(ra, dec, site, mjd) - limits.moon_separation_deg, -sky.moon_altitude_deg
    )
    least = np.degrees(np.arcsin(1 / limits.airmass))
    return np.minimum(
        moon, np.minimum(altitude - least, limits.sun_altitude_deg - sky.sun_altitude_deg)
    )


@settings(deadline=None, max_examples=80)
@given(sites, limits_drawn, first_nights, right_ascensions, declinations)
def test_limits_hold_inside_and_not_outside(site, limits, first, ra, dec):
    nights = nights_at(site, first, first + 3, limits)
    windows = windows_of([ra], [dec], site, nights, limits)
    share = np.linspace(0.001, 0.999, 15)
    length = windows.end_mjd - windows.start_mjd
    inside = windows.start_mjd[:, None] + length[:, None] * share
    assert (length >= 1 / 1440 - 1e-10).all()
    assert (excess(site, limits, ra, dec, inside) > -MARGIN_DEG).all()
    for k in range(nights.night.size):
        start, end = nights.dark_start_mjd[k], nights.dark_end_mjd[k]
        if np.isnan(start):
            assert not (windows.night == k).any()
            continue
        times = np.linspace(start, end, 42)[1:-1]
        spans = [
            (windows.start_mjd[i], windows.end_mjd[i]) for i in np.flatnonzero(windows.night == k)
        ]
        is_out = ~np.any([(times >= a) & (times <= b) for a, b in [*spans, (0, 0)]], axis=0)
        # what lies outside is broken now or within less than a minute: shorter pieces are dropped
        around = times[is_out, None] + np.array([-40, -20, 0, 20, 40]) / 86400
        around = np.clip(around, start, end)
        assert (excess(site, limits, ra, dec, around).min(axis=1) < MARGIN_DEG).all()


@settings(deadline=None, max_examples=25)
@given(
    sites,
    limits_drawn,
    first_nights,
    st.lists(st.tuples(right_ascensions, declinations), min_size=2, max_size=5),
    st.randoms(use_true_random=False),
)
def test_the_order_of_targets_does_not_matter(site, limits, first, targets, random):
    nights = nights_at(site, first, first + 5, limits)
    order = list(range(len(targets)))
    random.shuffle(order)
    ra, dec = np.array(targets).T
    straight = windows_of(ra, dec, site, nights, limits)
    shuffled = windows_of(ra[order], dec[order], site, nights, limits)
    for new, old in enumerate(order):
        here, there = straight.target == old, shuffled.target == new
        for name in straight.__slots__[2:]:
            np.testing.assert_array_equal(
                getattr(straight, name)[here], getattr(shuffled, name)[there]
            )


@settings(deadline=None, max_examples=40)
@given(sites, limits_drawn, first_nights, right_ascensions, declinations)
def test_stricter_limits_never_add_time(site, limits, first, ra, dec):
    nights = nights_at(site, first, first + 3, limits)
    stricter = Limits(
        1 + (limits.airmass - 1) / 2, limits.sun_altitude_deg, limits.moon_separation_deg + 20
    )

    def hours(rule):
        windows = windows_of([ra], [dec], site, nights, rule)
        return (windows.end_mjd - windows.start_mjd).sum()

    assert hours(stricter) <= hours(limits) + 1e-9
