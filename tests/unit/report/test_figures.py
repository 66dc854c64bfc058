"""Figures are looked at by eye; here: they hold what they should and nothing is clipped."""

from dataclasses import replace

import numpy as np
import pytest

from planner.model.campaign import Layout
from planner.model.plan import SiteSky
from planner.model.trial import Score
from planner.pipeline import tools_with
from planner.report import example_figure, png, success_figure, visibility_figure
from planner.scoring import Job, example_of, score_jobs, setting_of
from planner.sky import nights_at, windows_of


def score(cadence, length, success, trials=100):
    return Score(
        target="One", layout=Layout(cadence, 1, length, 1), promise=0.9, epochs_line=20,
        epochs_continuum=60,
        success=success, success_lo=success, success_hi=success, claims=success, false_claims=0,
        false_claims_lo=0, false_claims_hi=0, hours=10, hours_line=5, hours_shutter=4,
        trials=trials, note="",
    )  # fmt: skip


@pytest.fixture
def scores():
    return [
        score(3, 60, 0.2), score(3, 120, 0.9), score(6, 60, 0.1), score(6, 120, np.nan, trials=0),
    ]  # fmt: skip


def inside(figure):
    """Say whether all that is drawn lies on the page."""
    figure.canvas.draw()
    drawn, page = figure.get_tightbbox(), figure.bbox_inches
    return (
        page.x0 <= drawn.x0 and drawn.x1 <= page.x1 and page.y0 <= drawn.y0 and drawn.y1 <= page.y1
    )


def test_the_success_grid_shows_every_layout_the_goal_and_the_choice(scores):
    figure = success_figure(scores, scores[1], 0.8)
    panel, bar = figure.axes
    assert [t.get_text() for t in panel.texts] == ["20", "90", "10", "–"]
    assert panel.get_xlabel() == "season length [d]"
    assert panel.get_ylabel() == "nights between spectra"
    assert bar.get_ylabel() == "chance of success"
    (mark,) = [line for line in panel.lines if line.get_marker() == "o"]
    assert (mark.get_xdata()[0], mark.get_ydata()[0]) == (1, 0)
    outline = [line for line in panel.lines if line.get_marker() != "o"]
    assert len(outline) == 4, "the four edges of the one cell over the goal"
    assert inside(figure)


def test_the_visibility_chart_has_a_row_per_target(campaign, site):
    nights = nights_at(site, campaign.first_night, campaign.last_night, campaign.limits)
    ra = np.array([t.ra_deg for t in campaign.targets])
    dec = np.array([t.dec_deg for t in campaign.targets])
    figure = visibility_figure(
        campaign, SiteSky(nights, *[windows_of(ra, dec, site, nights, campaign.limits)] * 2)
    )
    moon, main, bar = figure.axes
    assert [label.get_text() for label in main.get_yticklabels()] == ["One", "Two"]
    assert main.images[0].get_array().shape == (2, 181)
    assert np.nanmax(main.images[0].get_array()) < 12
    assert bar.get_ylabel() == "hours"
    assert "moon" in moon.get_ylabel()
    assert inside(figure)


@pytest.mark.slow
@pytest.mark.parametrize("few", [False, True])
def test_the_example_is_drawn_even_when_no_lag_was_looked_for(campaign, prospect, few):
    setting = setting_of(campaign)
    layout = Layout(150 if few else 3, 1, 120, 1)
    with tools_with() as tools:
        (table,) = score_jobs([Job(setting, prospect, layout, 8)], tools, "trials")
    example = example_of(setting, prospect, layout, table)
    assert (example.result is None) == few
    figure = example_figure(example)
    assert inside(figure)
    assert figure.axes[3].get_xlabel() == "lag, observed frame [d]"


def test_png_holds_no_date_and_is_the_same_each_time(scores):
    first, second = (png(success_figure(scores, scores[1], 0.8)) for _ in range(2))
    assert first == second
    assert first.startswith(b"\x89PNG")


def test_a_target_that_is_called_like_markup_harms_no_page(scores):
    odd = [replace(s, target="<b>&$x^2$") for s in scores]
    assert png(success_figure(odd, odd[1], 0.8))
