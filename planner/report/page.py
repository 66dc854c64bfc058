"""The report: one self-contained HTML page."""

from __future__ import annotations

from base64 import b64encode
from collections.abc import Sequence
from importlib.resources import files
from typing import Any

from planner.model.plan import Plan, Sensitivity
from planner.model.trial import Score

__all__ = ["page"]


def page(
    plan: Plan,
    figures: dict[str, bytes],
    epochs: list[dict[str, Any]],
    defaults: list[tuple[str, str, str]],
) -> bytes:
    """Return the report as HTML.

    Parameters
    ----------
    plan : Plan
    figures : dict of str to PNG bytes
        ``visibility <site>``, ``success <target>`` and ``example <target>``.
    epochs : list of dict
        What one visit of each telescope to each target measures: the rows of the epochs' table.
    defaults : list of (key, value, reason)
        Defaults taken in the campaign file.
    """
    import jinja2

    environment = jinja2.Environment(autoescape=True, undefined=jinja2.StrictUndefined)
    environment.filters["percent"] = lambda share: f"{100 * share:.0f}\u00a0%"
    environment.filters["sig2"] = lambda value: f"{float(f'{value:.2g}'):g}"
    template = environment.from_string((files("planner.report") / "page.html").read_text("utf-8"))
    images = {name: f"data:image/png;base64,{b64encode(b).decode()}" for name, b in figures.items()}
    return template.render(
        plan=plan,
        cards=[_card(plan, i, images, epochs) for i in range(len(plan.recommendations))],
        summary=_summary(plan),
        visibility={site: images[f"visibility {site}"] for site in plan.skies},
        defaults=defaults,
    ).encode()


def _card(
    plan: Plan, index: int, images: dict[str, str], epochs: list[dict[str, Any]]
) -> dict[str, Any]:
    recommendation = plan.recommendations[index]
    name = recommendation.target
    return {
        "name": name,
        "forecast": plan.forecasts[index],
        "spread": 10 ** plan.forecasts[index].lag_scatter_dex,
        "advice": recommendation,
        "executed": plan.executed.get(name),
        "epochs": [row for row in epochs if row["target"] == name],
        "grid": images.get(f"success {name}"),
        "example": images.get(f"example {name}"),
        "ambiguity": images.get(f"ambiguity {name}"),
        "sensitivity": _by_factor(plan.sensitivities.get(name, ())),
        "relations": [x for x in plan.sensitivities.get(name, ()) if x.factor == "relation"],
        "opinions": [o for o in plan.opinions if o.target == name],
    }


FACTORS = {
    "lag": "the lag is",
    "amplitude": "the variability's amplitude is",
    "timescale": "its timescale is",
    "weather": "the weather of its seasons is",
}


def _by_factor(found: Sequence[Sensitivity]) -> list[tuple[str, list[Sensitivity]]]:
    """Return the three levels of each factor under its words."""
    rows = ((words, [x for x in found if x.factor == key]) for key, words in FACTORS.items())
    return [(words, levels) for words, levels in rows if levels]


def _summary(plan: Plan) -> list[str]:
    """Answer the observer's first questions in sentences."""
    kept = [r for r in plan.recommendations if r.scheduled]
    met = sum(r.decision == "observe" for r in plan.recommendations)
    total = len(plan.recommendations)
    lags = sum(s.success for s in plan.executed.values())
    wrong = sum(s.false_claims for s in plan.executed.values())
    goal = plan.campaign.success.goal
    sentences = [
        f"{met} of {total} reach the goal of {100 * goal:.0f}\u00a0% success on their own; "
        f"scheduled: {len(kept)}.",
    ]
    if kept:
        sentences += [
            f"The schedule of all of them is expected to give {lags:.1f} right lags "
            f"and {wrong:.1f} wrong ones.",
            f"It takes about {_hours(plan.executed):.0f} clock hours in average weather; for clear "
            f"skies throughout, {len(plan.visits)} visits are laid out.",
        ]
    return sentences


def _hours(executed: dict[str, Score]) -> float:
    return sum(s.hours for s in executed.values())
