"""The campaign's figures."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date, timedelta

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.gridspec import GridSpec
from matplotlib.image import AxesImage

from planner.model.campaign import Campaign, Layout
from planner.model.plan import SiteSky
from planner.model.trial import Score
from planner.recovery import Ambiguity
from planner.report.style import (
    BLUE,
    GREEN,
    GREY,
    INK,
    ORANGE,
    SHADES,
    VERMILION,
    new_figure,
    styled,
)
from planner.scoring import Curves, Example, OwnRecovery

__all__ = [
    "ambiguity_figure",
    "example_figure",
    "recovery_figure",
    "success_figure",
    "visibility_figure",
]

MJD_EPOCH = date(1858, 11, 17)


def success_figure(scores: Sequence[Score], chosen: Score, goal: float) -> Figure:
    """Draw the success grid of one target: cadence against season length, a panel per seasons.

    The goal's contour and the advised layout are marked; where no trials were needed the forecast
    stands, in italics; a dash: could not be scheduled. Continuum cadence, exposures and shift
    are those of the advised layout.
    """
    kept = [s for s in scores if _rest(s.layout) == _rest(chosen.layout)]
    # Of the layouts looked at between the candidates the table tells.
    shown = [s for s in kept if not s.added or s.layout == chosen.layout]
    cadences = sorted({s.layout.cadence_line_nights for s in shown})
    lengths = sorted({s.layout.season_length_d for s in shown})
    numbers = sorted({s.layout.seasons for s in kept})
    with styled():
        width = 1.6 + max(3.1, 0.6 * len(lengths)) * len(numbers)
        figure = new_figure(width, 1.3 + 0.45 * len(cadences))
        axes = figure.subplots(1, len(numbers), sharey=True, squeeze=False)[0]
        for ax, number in zip(axes, numbers, strict=True):
            image = _grid_panel(
                ax,
                _cells(kept, cadences, lengths, number),
                (len(cadences), len(lengths)),
                goal,
            )
            if number == chosen.layout.seasons:
                ax.plot(
                    lengths.index(chosen.layout.season_length_d),
                    cadences.index(chosen.layout.cadence_line_nights),
                    "o",
                    ms=23,
                    mfc="none",
                    mec=VERMILION,
                    mew=2.5,
                )
            ax.set_xticks(range(len(lengths)), [f"{v:g}" for v in lengths])
            ax.set_yticks(range(len(cadences)), [f"{v:g}" for v in cadences])
            ax.set_xlabel("season length [d]")
            ax.set_title("one season" if number == 1 else f"{number} seasons")
        axes[0].set_ylabel("nights between spectra")
        bar = figure.colorbar(image, ax=list(axes), label="chance of success")
        bar.ax.axhline(goal, color=VERMILION, lw=2)
        bar.ax.set_yticks([0, 0.2, 0.4, 0.6, 0.8, 1.0])
    return figure


def _rest(layout: Layout) -> tuple[float, ...]:
    """Return what is the same all over a success grid."""
    return (layout.cadence_continuum_nights, layout.shift_d, *layout.exposures)


def _cells(
    scores: Sequence[Score], cadences: Sequence[float], lengths: Sequence[float], seasons: int
) -> dict[tuple[int, int], Score]:
    """Return the scores of one panel by row and column."""
    return {
        (
            cadences.index(s.layout.cadence_line_nights),
            lengths.index(s.layout.season_length_d),
        ): s
        for s in scores
        if s.layout.seasons == seasons
        and s.layout.cadence_line_nights in cadences
        and s.layout.season_length_d in lengths
    }


def _grid_panel(
    ax: Axes, cells: dict[tuple[int, int], Score], shape: tuple[int, int], goal: float
) -> AxesImage:
    """Draw one panel of shades with its numbers and the goal's contour; return the shades."""
    ax.set_facecolor("#d9d9d9")
    success = np.full(shape, np.nan)
    for at, s in cells.items():
        success[at] = s.success
        can = s.success_hi > 0
        value = s.success if s.trials else s.promise
        ax.text(
            at[1],
            at[0],
            f"{100 * value:.0f}" if can else "–",
            ha="center",
            va="center",
            fontsize=8,
            style="normal" if s.trials else "italic",
            color="white" if s.trials and value < 0.55 else "black",
        )
    image = ax.imshow(success, vmin=0, vmax=1, cmap=SHADES, aspect="auto", origin="lower")
    _goal_contour(ax, np.nan_to_num(success, nan=-1.0) >= goal)
    return image


def _goal_contour(ax: Axes, reached: np.ndarray) -> None:
    """Outline the cells that reach the goal, along the cells' edges."""
    padded = np.pad(reached, 1)
    rows, columns = reached.shape
    for row in range(rows + 1):
        for column in range(columns):
            if padded[row, column + 1] != padded[row + 1, column + 1]:
                ax.plot([column - 0.5, column + 0.5], [row - 0.5] * 2, color=VERMILION, lw=2)
    for row in range(rows):
        for column in range(columns + 1):
            if padded[row + 1, column] != padded[row + 1, column + 1]:
                ax.plot([column - 0.5] * 2, [row - 0.5, row + 0.5], color=VERMILION, lw=2)


def visibility_figure(campaign: Campaign, sky: SiteSky) -> Figure:
    """Draw when each target can be observed: targets against nights, hours as shade.

    A strip above shows the moon's illuminated fraction at midnight.
    """
    nights = sky.nights
    targets = [t.name for t in campaign.targets]
    hours = np.zeros((len(targets), nights.night.size))
    w = sky.windows
    np.add.at(hours, (w.target, w.night), (w.end_mjd - w.start_mjd) * 24)
    with styled():
        figure = new_figure(9.0, 1.5 + 0.32 * len(targets))
        grid = GridSpec(2, 1, figure=figure, height_ratios=[0.5, max(len(targets), 2) * 0.45])
        moon = figure.add_subplot(grid[0])
        main = figure.add_subplot(grid[1], sharex=moon)
        extent = (-0.5, nights.night.size - 0.5, len(targets) - 0.5, -0.5)
        moon.fill_between(
            np.arange(nights.night.size), nights.moon_illumination, color=ORANGE, lw=0
        )
        moon.set_ylim(0, 1)
        moon.set_yticks([0, 1], ["new", "full"])
        moon.set_ylabel("moon", rotation=0, ha="right", va="center")
        moon.tick_params(labelbottom=False)
        image = main.imshow(
            np.where(hours > 0, hours, np.nan),
            aspect="auto",
            cmap=SHADES,
            extent=extent,
            vmin=0,
            vmax=max(1.0, float(hours.max())),
            interpolation="nearest",
        )
        main.set_yticks(range(len(targets)), targets)
        _month_ticks(main, int(nights.night[0]), nights.night.size)
        main.set_xlabel(f"evening date at {nights.site}")
        figure.colorbar(image, ax=[main], label="hours", pad=0.01)
    return figure


def _month_ticks(ax: Axes, first: int, nights: int) -> None:
    """Mark the first of the months, at most about a dozen, with the year where it changes."""
    days = [MJD_EPOCH + timedelta(days=first + i) for i in range(nights)]
    firsts = [i for i, day in enumerate(days) if day.day == 1]
    step = max(1, -(-len(firsts) // 12))
    firsts = firsts[::step]
    labels, year = [], None
    for i in firsts:
        labels.append(days[i].strftime("%b\n%Y" if days[i].year != year else "%b"))
        year = days[i].year
    ax.set_xticks(firsts, labels)


def example_figure(example: Example) -> Figure:
    """Draw one simulated campaign: light curves, correlation function, centroid distribution."""
    c = example.curves
    start = min([*c.t_continuum[:1], *c.t_line[:1]], default=0.0)
    with styled():
        figure = new_figure(9.0, 3.4)
        grid = GridSpec(2, 3, figure=figure)
        top = figure.add_subplot(grid[0, :2])
        low = figure.add_subplot(grid[1, :2], sharex=top)
        _curve(top, c.t_continuum - start, c.f_continuum, c.e_continuum, BLUE, "o", "continuum")
        _curve(low, c.t_line - start, c.f_line, c.e_line, VERMILION, "s", "line")
        top.tick_params(labelbottom=False)
        low.set_xlabel("days since the first epoch")
        correlation = figure.add_subplot(grid[0, 2])
        centroids = figure.add_subplot(grid[1, 2], sharex=correlation)
        result = example.result
        if result is not None:
            correlation.plot(result.lags_d, result.r, color=INK, lw=1)
            beyond = 1.05 * example.lag_true_d  # a lag out of reach is shown, too
            correlation.set_xlim(result.lags_d[0], max(result.lags_d[-1], beyond))
            found = result.centroids_d[np.isfinite(result.centroids_d)]
            bins = np.linspace(result.lags_d[0], result.lags_d[-1], 61)
            centroids.hist(found, bins=bins.tolist(), color=GREY)
        if example.posterior is not None and example.posterior.density.size:
            density = example.posterior.density
            likely = centroids.twinx()
            likely.plot(example.posterior.lags_d, density / density.max(), color=BLUE, lw=1.2)
            likely.set_ylim(0, 1.6)
            likely.set_yticks([])
            centroids.plot([], [], color=BLUE, lw=1.2, label="likelihood")
        correlation.set_ylabel("correlation r")
        correlation.tick_params(labelbottom=False)
        centroids.set_ylabel("resamples")
        centroids.set_xlabel("lag, observed frame [d]")
        for ax in (correlation, centroids):
            ax.axvline(example.lag_true_d, color=GREEN, lw=1.5, ls="--", label="true lag")
            if result is not None and np.isfinite(result.lag_d):
                ax.axvspan(
                    result.lag_lo_d,
                    result.lag_hi_d,
                    color=ORANGE,
                    alpha=0.35,
                    lw=0,
                    label="recovered, 68 %",
                )
        centroids.set_ylim(top=1.6 * max(1.0, centroids.get_ylim()[1]))  # room for the legend
        centroids.legend(loc="upper right", fontsize=7)
    return figure


def ambiguity_figure(curve: Ambiguity, lag_d: float) -> Figure:
    """Draw which other lags the recommended epochs could be mistaken for."""
    with styled():
        figure = new_figure(9.0, 1.9)
        ax = figure.subplots()
        ax.fill_between(curve.lags_d, curve.mistaken, color=ORANGE, lw=0)
        ax.axvline(lag_d, color=GREEN, lw=1.5, ls="--", label="expected lag")
        ax.set_xlim(curve.lags_d[0], curve.lags_d[-1])
        ax.set_ylim(0, 0.5)
        ax.set_xlabel("other lag, observed frame [d]")
        ax.set_ylabel("chance to be\nlikelier")
        ax.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0))
    return figure


def recovery_figure(curves: Curves, found: OwnRecovery) -> Figure:
    """Draw an observer's own light curves and what each method makes of them."""
    start = float(min(curves.t_continuum.min(), curves.t_line.min()))
    with styled():
        figure = new_figure(9.0, 3.6)
        grid = GridSpec(2, 3, figure=figure)
        top = figure.add_subplot(grid[0, :2])
        low = figure.add_subplot(grid[1, :2], sharex=top)
        for ax, t, f, e, colour, mark, name in (
            (top, *curves.columns()[:3], BLUE, "o", "continuum"),
            (low, *curves.columns()[3:], VERMILION, "s", "line"),
        ):
            ax.errorbar(t - start, f, yerr=e, fmt=mark, ms=3, color=colour, ecolor=GREY, lw=0.7)
            ax.set_ylabel(f"{name} flux")
        top.tick_params(labelbottom=False)
        low.set_xlabel(f"days since {start:.1f}")
        correlation = figure.add_subplot(grid[0, 2])
        likely = figure.add_subplot(grid[1, 2], sharex=correlation)
        result, posterior = found.correlation, found.likelihood
        correlation.plot(result.lags_d, result.r, color=INK, lw=1)
        correlation.set_ylabel("correlation r")
        correlation.tick_params(labelbottom=False)
        likely.set_xlabel("lag, observed frame [d]")
        likely.set_ylabel("over the peak")
        if result.centroids_d.size:
            counts, edges = np.histogram(result.centroids_d, bins=80)
            likely.stairs(counts / counts.max(), edges, fill=True, color=GREY, label="resampled")
        if posterior.density.size:
            shape = posterior.density / posterior.density.max()
            likely.plot(posterior.lags_d, shape, color=BLUE, lw=1.2, label="likelihood")
        likely.set_ylim(0, 1.6)
        likely.legend(loc="upper right", fontsize=7)
    return figure


def _curve(
    ax: Axes, t: np.ndarray, flux: np.ndarray, error: np.ndarray, colour: str, mark: str, name: str
) -> None:
    ax.errorbar(t, flux, yerr=error, fmt=mark, ms=3, color=colour, ecolor=GREY, elinewidth=0.7)
    ax.set_ylabel(f"{name}\n[mean flux = 1]")
    for season_edge in np.flatnonzero(np.diff(t) > 40):
        ax.axvspan(t[season_edge], t[season_edge + 1], color="#eeeeee", lw=0)
