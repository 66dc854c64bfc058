"""The windows kernel against a plain search through each night.

Both look at the moon sample by sample: an interruption between two samples that are both free of
the moon, minutes in which it passes its limit by a hair, is overlooked by both.
"""

import numpy as np
import pytest
from scipy.interpolate import KroghInterpolator

from planner.kernels.sky_windows import target_windows

NIGHTS, SAMPLES = 12, 49
TURN_PER_DAY = 2 * np.pi * 1.00273781191135448


def rotations(rng, count):
    """Random rotation matrices."""
    matrices, _ = np.linalg.qr(rng.normal(size=(count, 3, 3)))
    return matrices * np.sign(np.linalg.det(matrices))[:, None, None]


def moon_tracks(rng, place):
    """Moons that pass near `place` by some degrees in a night, some rising, some setting."""
    tracks = np.empty((NIGHTS, SAMPLES, 5))
    phase = np.linspace(-1, 1, SAMPLES)
    for n in range(NIGHTS):
        along = np.cross(place[n], rng.normal(size=3))
        along /= np.linalg.norm(along)
        across = np.cross(place[n], along)
        way = np.radians(rng.uniform(3, 12)) * phase + np.radians(rng.uniform(-35, 35))
        off = np.radians(rng.uniform(0, 40))
        vector = (
            np.cos(way)[:, None] * (np.cos(off) * place[n] + np.sin(off) * across)
            + np.sin(way)[:, None] * along
        )
        tracks[n, :, :3] = vector
        tracks[n, :, 3] = np.sin(rng.uniform(-1, 1) + rng.choice([-1, 1]) * phase)
        tracks[n, :, 4] = 0.5 + 0.01 * phase
    return tracks


def draw(rng):
    """Return the arguments of one call before the limits."""
    direction = rng.normal(size=3)
    direction /= np.linalg.norm(direction)
    velocity = 1e-4 * rng.normal(size=(NIGHTS, 3)) / np.sqrt(3)
    to_date = rotations(rng, NIGHTS)
    place = np.einsum("nij,nj->ni", to_date, direction + velocity)
    place /= np.linalg.norm(place, axis=1, keepdims=True)
    start = 61000.0 + np.arange(NIGHTS) + rng.uniform(0, 0.3, NIGHTS)
    end = start + rng.uniform(0.1, 1.0, NIGHTS)
    start[3] = end[3] = np.nan
    angle = rng.uniform(-10, 10, NIGHTS)
    latitude = rng.uniform(-1.5, 1.5)
    tables = (direction, velocity, to_date, start, end, angle, moon_tracks(rng, place))
    return place, (*tables, np.sin(latitude), np.cos(latitude))


def cubic(track, position):
    """Interpolate through the four samples around a position, by another library."""
    first = min(max(int(position) - 1, 0), SAMPLES - 4)
    around = np.arange(first, first + 4)
    return KroghInterpolator(around, track[around])(position)


def spans(holds, grid):
    """Return the spans in which `holds`, true or false on a grid, by halving the steps between."""
    answers = [holds(t) for t in grid]
    edges = [grid[0]] if answers[0] else []
    for k in np.flatnonzero(np.diff(answers)):
        left, right = grid[k], grid[k + 1]
        while right - left > 2e-11:
            middle = (left + right) / 2
            left, right = (middle, right) if holds(middle) == answers[k] else (left, middle)
        edges.append(left)
    edges += [grid[-1]] if answers[-1] else []
    return list(zip(edges[::2], edges[1::2], strict=True))


def search(place, tables, sin_altitude, cos_separation, shortest_d):
    """Plain twin: spans above the altitude limit, spans without moon, and their overlaps."""
    _, _, _, starts, ends, angles, moon, sin_latitude, cos_latitude = tables
    rows = []
    for n in np.flatnonzero(np.isfinite(starts)):
        begin, finish = starts[n], ends[n]
        x, y, z = place[n]

        def height(t, x=x, y=y, z=z, n=n, begin=begin):
            angle = angles[n] + TURN_PER_DAY * (t - begin)
            equator = x * np.cos(angle) + y * np.sin(angle)
            return sin_latitude * z + cos_latitude * equator

        def moon_at(t, n=n, begin=begin, finish=finish):
            return cubic(moon[n], (t - begin) / (finish - begin) * (SAMPLES - 1))

        def is_free(t, moon_at=moon_at, n=n):
            there = moon_at(t)
            return there[:3] @ place[n] <= cos_separation or there[3] <= 0

        high = spans(
            lambda t, height=height: height(t) >= sin_altitude, np.linspace(begin, finish, 1501)
        )
        free = spans(is_free, np.linspace(begin, finish, SAMPLES))
        overlaps = sorted((max(a, c), min(b, d)) for a, b in high for c, d in free)
        for start, end in overlaps:
            if end - start >= shortest_d:
                fine = np.linspace(start, end, 20001)
                best = fine[np.argmax(height(fine))]
                there = moon_at(best)
                rows.append(
                    (n, start, end, best, height(best), there[:3] @ place[n], there[3], there[4])
                )
    return np.array(rows).reshape(-1, 8)


@pytest.mark.parametrize("seed", range(8))
def test_kernel_equals_the_plain_search(seed):
    rng = np.random.default_rng(seed)
    place, tables = draw(rng)
    sin_altitude, cos_separation, shortest = np.sin(0.4), np.cos(np.radians(30)), 1 / 1440
    night, rows = np.empty(99, np.int32), np.empty((99, 7))
    count = target_windows(*tables, sin_altitude, cos_separation, -1.0, shortest, night, rows)
    twin = search(place, tables, sin_altitude, cos_separation, shortest)
    assert count == len(twin)
    np.testing.assert_array_equal(night[:count], twin[:, 0])
    np.testing.assert_allclose(rows[:count, :2], twin[:, 1:3], rtol=0, atol=1e-10)
    # the twin's time of greatest altitude is one of 20000 steps; heights there are flat
    np.testing.assert_allclose(rows[:count, 2], twin[:, 3], rtol=0, atol=1e-4)
    np.testing.assert_allclose(rows[:count, 3], twin[:, 4], rtol=0, atol=1e-7)
    np.testing.assert_allclose(rows[:count, 4:], twin[:, 5:], rtol=0, atol=1e-4)


def test_moons_far_away_are_passed_over_without_changing_the_answer():
    rng = np.random.default_rng(99)
    _, tables = draw(rng)
    answers = []
    for cos_clear in (-1.0, np.cos(np.radians(30 + 36))):
        night, rows = np.zeros(99, np.int32), np.zeros((99, 7))
        rule = (0.2, np.cos(np.radians(30)), cos_clear, 1 / 1440)
        answers.append((target_windows(*tables, *rule, night, rows), rows))
    assert answers[0][0] == answers[1][0] > 0
    np.testing.assert_array_equal(answers[0][1], answers[1][1])


def test_full_capacity_counts_on_without_writing_on():
    rng = np.random.default_rng(1)
    _, tables = draw(rng)
    rule = (-0.9, np.cos(np.radians(30)), -1.0, 1 / 1440)
    night, rows = np.empty(99, np.int32), np.empty((99, 7))
    count = target_windows(*tables, *rule, night, rows)
    few_night, few_rows = np.full(3, -1, np.int32), np.full((3, 7), np.nan)
    assert target_windows(*tables, *rule, few_night[:2], few_rows[:2]) == count > 3
    np.testing.assert_array_equal(few_rows[:2], rows[:2])
    assert np.isnan(few_rows[2]).all()
    assert few_night[2] == -1
