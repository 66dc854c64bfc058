"""The command for an observer's own light curves: recover."""

from __future__ import annotations

from argparse import Namespace
from typing import TYPE_CHECKING, Any

from planner.base.errors import InputError
from planner.cli.shared import say, say_json
from planner.cli.terminal import significant, table_text

if TYPE_CHECKING:
    from planner.scoring import OwnRecovery

__all__ = ["recover"]

NO_LAG = 1
"""Exit status where no method finds any lag."""


def recover(options: Namespace) -> int:
    """Print the lag of an observer's own two light curves, by every method."""
    import numpy as np

    from planner.base.files import claim_folder, write_bytes
    from planner.campaign import cuts_named, read_light_curve
    from planner.scoring import STRANGERS, Curves, key_of, recover_own

    continuum, line = read_light_curve(options.continuum), read_light_curve(options.line)
    if np.ptp(np.concatenate([continuum.time_d, line.time_d])) == 0:
        raise InputError(f"{options.continuum}: all epochs of both curves are at one time")
    curves = Curves(*continuum, *line)
    rule = cuts_named(options.cuts)
    if options.out is not None:
        claim_folder(
            options.out,
            key_of("recover", curves, rule, options.seed, options.detrend),
            replace=options.replace,
        )
    seed = 1 if options.seed is None else options.seed
    found = recover_own(curves, rule, seed, detrend=options.detrend)
    if options.out is not None:
        from planner import report

        write_bytes(options.out / "recovery.png", report.png(report.recovery_figure(curves, found)))
    reasons = (found.correlation.reason, found.likelihood.reason, found.discrete.reason)
    status = NO_LAG if all(reasons) else 0
    if options.json:
        say_json(_as_dict(found, options.cuts))
        return status
    say(table_text(["method", "lag [d]", "68 % interval [d]", "claim", "remark"], _rows(found)))
    for lag, share in found.correlation.aliases:
        say(f"another peak of the correlation's lags: {significant(lag)} d holds {share:.0%}")
    for alias in found.likelihood.aliases[1:]:
        say(f"another peak of the likelihood: {significant(alias.lag_d)} d holds {alias.share:.0%}")
    if np.isfinite(found.chance):
        often = f"{found.chance:.1%}" if found.chance else "none"
        say(f"unrelated lines correlate as well in {often} of {STRANGERS} simulations")
    if np.isfinite(found.likelihood.log_odds):
        odds = np.exp(min(found.likelihood.log_odds, 30.0))
        say(f"odds of an echo against an unrelated line: {odds:.3g} to 1")
    say(f"lags in the observed frame; claims by the {options.cuts} cuts")
    return status


def _rows(found: OwnRecovery) -> list[list[str]]:
    correlation, likelihood, discrete = found.correlation, found.likelihood, found.discrete
    rows = []
    for name, r, claim, remark in (
        ("correlation", correlation, found.correlation_claim, f"peak r {correlation.r_max:.2f}"),
        ("likelihood", likelihood, found.likelihood_claim, _share(likelihood.primary_share)),
        ("discrete correlation", discrete, None, f"peak r {discrete.r_max:.2f}"),
    ):
        if r.reason:
            rows.append([name, "none", "–", "no", r.reason])
            continue
        interval = f"{significant(r.lag_lo_d, 3)} to {significant(r.lag_hi_d, 3)}"
        verdict = "–" if claim is None else "yes" if claim else "no"
        rows.append([name, significant(r.lag_d, 3), interval, verdict, remark])
    return rows


def _share(share: float) -> str:
    return f"{share:.0%} in the primary peak"


def _as_dict(found: OwnRecovery, cuts: str) -> dict[str, Any]:
    """Return everything as plain values; what is not finite becomes None."""
    methods: dict[str, tuple[Any, tuple[str, ...]]] = {
        "correlation": (found.correlation, ("r_max", "peak_d", "share", "in_peak")),
        "likelihood": (found.likelihood, ("peak_d", "primary_share", "log_odds")),
        "discrete": (found.discrete, ("r_max",)),
    }
    result: dict[str, Any] = {"cuts": cuts}
    for name, (record, extra) in methods.items():
        values = {
            key: _finite(getattr(record, key)) for key in ("lag_d", "lag_lo_d", "lag_hi_d", *extra)
        }
        result[name] = values | {"reason": record.reason}
    result["correlation"]["claim"] = found.correlation_claim
    result["likelihood"]["claim"] = found.likelihood_claim
    return result | {"chance": _finite(found.chance), "agree": found.agree}


def _finite(value: float) -> float | None:
    import math

    return float(value) if math.isfinite(value) else None
