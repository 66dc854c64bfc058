"""Questions asked while the observer is still thinking: one target, one change, no trials."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

from planner.base.errors import InputError
from planner.model.campaign import Layout
from planner.model.trial import Prospect
from planner.pipeline import forecast_targets, observe_sky, read
from planner.scoring import (
    LayoutForecast,
    deepened,
    forecast_layout,
    layouts_of,
    prospect_of,
    setting_of,
)

__all__ = ["WhatIf"]


class WhatIf:
    """A campaign that answers what a change of one target's layout would bring.

    Answers are information forecasts: the success of a likelihood recovery that knows variability
    and response. Trials fall short of them, but the order of layouts is much the same. The same
    question gets the same answer.

    Parameters
    ----------
    path : str or Path
        Campaign file.

    Raises
    ------
    planner.base.errors.InputError
        If the file cannot be used.
    """

    def __init__(self, path: str | Path) -> None:
        self._campaign = read(Path(path)).campaign
        self._setting = setting_of(self._campaign)
        self._forecasts = forecast_targets(self._campaign)
        self._skies = observe_sky(self._campaign)
        self._prospects: dict[tuple[str, tuple[float, float]], Prospect] = {}

    @property
    def targets(self) -> tuple[str, ...]:
        """Return the names of the targets."""
        return tuple(t.name for t in self._campaign.targets)

    def layouts(self, target: str) -> tuple[Layout, ...]:
        """Return the candidate layouts of a target. Raises `InputError` for an unknown one."""
        return layouts_of(self._campaign, self._prospect(target, (1.0, 1.0)))

    def ask(self, target: str, layout: Layout | None = None, **changes: Any) -> LayoutForecast:
        """Return the forecast of one layout of one target.

        Parameters
        ----------
        target : str
        layout : Layout, optional
            To start from; without, the first candidate.
        **changes
            Fields of `planner.model.campaign.Layout`, such as ``cadence_line_nights=4.0``,
            ``shift_d=30.0`` (seasons a month later) or ``exposure_line=2.0``.

        Raises
        ------
        planner.base.errors.InputError
            For an unknown target or an unknown field.
        """
        unknown = changes.keys() - Layout.__dataclass_fields__.keys()
        if unknown:
            known = ", ".join(Layout.__dataclass_fields__)
            raise InputError(f"no field {', '.join(sorted(unknown))}; expected any of {known}")
        asked = replace(layout or self.layouts(target)[0], **changes)
        return forecast_layout(self._setting, self._prospect(target, asked.exposures), asked)

    def _prospect(self, target: str, exposures: tuple[float, float]) -> Prospect:
        key = (target, exposures)
        if key not in self._prospects:
            if target not in self.targets:
                raise InputError(f"no target {target}; expected one of {', '.join(self.targets)}")
            index = self.targets.index(target)
            campaign = deepened(self._campaign, *exposures)
            self._prospects[key] = prospect_of(campaign, index, self._forecasts[index], self._skies)
        return self._prospects[key]
