"""The command ``planner``."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Callable, Sequence
from importlib import import_module
from pathlib import Path

from planner.base.errors import PlannerError
from planner.base.provenance import planner_version

__all__ = ["main"]

INTERRUPTED = 130

EXAMPLES = """\
examples:
  planner start mine              write a commented campaign file and target list to edit
  planner check mine/campaign.yaml
  planner plan mine/campaign.yaml --out mine/plan
"""


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status."""
    parser = _parser()
    options = parser.parse_args(arguments)
    if options.command is None:
        parser.print_help()
        return 0
    try:
        status = _command(options.command)(options)
        sys.stdout.flush()
        return status
    except PlannerError as error:
        print(f"planner: {error}", file=sys.stderr)  # noqa: T201
        return error.exit_status
    except KeyboardInterrupt:
        print("planner: interrupted; the same command goes on from here", file=sys.stderr)  # noqa: T201
        return INTERRUPTED
    except BrokenPipeError:
        _drop_output()
        return 0
    except OSError as error:
        _drop_output()
        print(f"planner: the result cannot be printed: {error.strerror}", file=sys.stderr)  # noqa: T201
        return 2


def _drop_output() -> None:
    """Let what is still waiting for standard output go nowhere, so that Python can end quietly."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _command(name: str) -> Callable[[argparse.Namespace], int]:
    found: Callable[[argparse.Namespace], int] = getattr(import_module(_MODULES[name]), name)
    return found


_MODULES = {
    **dict.fromkeys(("start", "check", "lags", "nights", "trace"), "planner.cli.inputs"),
    **dict.fromkeys(("score", "schedule", "plan", "compare"), "planner.cli.planning"),
    "recover": "planner.cli.own_curves",
}


class _Parser(argparse.ArgumentParser):
    """Says what is wrong in one line."""

    def error(self, message: str) -> None:  # type: ignore[override]
        print(f"planner: {message}; see {self.prog} --help", file=sys.stderr)  # noqa: T201
        raise SystemExit(2)


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="planner",
        description="Plan reverberation-mapping campaigns: lags, nights, cadence, success.",
        epilog=EXAMPLES,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="version", version=f"planner {planner_version()}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", parser_class=_Parser)
    shared = _shared()
    for name, words in (
        ("plan", "the main job, all of the flow, into one folder"),
        ("check", "read and validate, print what was understood and every default taken"),
        ("lags", "each target's expected lag, its range, and the mass precision to expect"),
        ("nights", "windows per night, seasons and gaps, nights left after weather"),
        ("score", "every layout's chance of success for every target"),
        ("schedule", "night-by-night schedule for all targets"),
    ):
        command = commands.add_parser(name, help=words, description=words, parents=[shared])
        command.add_argument("file", type=Path, metavar="FILE", help="campaign file (YAML)")
        if name == "score":
            command.add_argument(
                "--forecast",
                action="store_true",
                help="no trials: rank the layouts by the information in their epochs, in seconds",
            )
            budget = command.add_mutually_exclusive_group()
            best = "also find the list of targets with the most lags for so many"
            budget.add_argument(
                "--hours", type=_hours, metavar="N", help=f"{best} clock hours of both streams"
            )
            budget.add_argument(
                "--nights", type=_hours, metavar="N", help=f"{best} nights of average darkness"
            )
    compare = commands.add_parser(
        "compare",
        help="scenarios side by side",
        description="scenarios side by side",
        parents=[shared],
    )
    compare.add_argument("files", type=Path, nargs="+", metavar="FILE", help="campaign files")
    words = "how each number of one target came about: inputs, formulas, sources"
    trace = commands.add_parser("trace", help=words, description=words, parents=[shared])
    trace.add_argument("file", type=Path, metavar="FILE", help="campaign file (YAML)")
    trace.add_argument("target", metavar="TARGET", help="name of a target")
    _add_recover(commands, shared)
    start = commands.add_parser(
        "start",
        help="a commented campaign file and target list to edit",
        description="Write a commented campaign file and target list to edit.",
    )
    start.add_argument("folder", type=Path, metavar="DIR")
    return parser


def _add_recover(commands: argparse._SubParsersAction[_Parser], shared: _Parser) -> None:
    words = "the lag of your own two light curves, by the same methods that judged the plan"
    recover = commands.add_parser("recover", help=words, description=words, parents=[shared])
    for name in ("continuum", "line"):
        recover.add_argument(
            name,
            type=Path,
            metavar=name.upper(),
            help=f"{name} light curve: CSV or ECSV with columns time (days), flux, flux_error",
        )
    recover.add_argument(
        "--cuts",
        choices=("exploratory", "usual", "strict"),
        default="usual",
        help="quality cuts that a lag must pass to be claimed",
    )
    recover.add_argument(
        "--detrend", action="store_true", help="take a straight line off both curves first"
    )


def _shared() -> _Parser:
    shared = _Parser(add_help=False)
    shared.add_argument("--out", type=Path, metavar="DIR", help="folder for the results")
    shared.add_argument(
        "--replace", action="store_true", help="overwrite an earlier plan in that folder"
    )
    shared.add_argument(
        "--workers",
        type=_count,
        metavar="N",
        default=os.cpu_count() or 1,
        help="processes to use (default: all cores; the results do not depend on it)",
    )
    shared.add_argument(
        "--cluster",
        metavar="ADDRESS",
        help="scheduler of a running Dask cluster to work on instead, such as tcp://head:8786",
    )
    shared.add_argument("--seed", type=_seed, metavar="N", help="random seed instead of the file's")
    shared.add_argument("--json", action="store_true", help="print the result as one JSON object")
    shared.add_argument("--quiet", action="store_true", help="no progress on stderr")
    return shared


def _count(text: str) -> int:
    if not text.isdecimal() or int(text) < 1:
        raise argparse.ArgumentTypeError(f"found {text!r}; expected a whole number of at least 1")
    return int(text)


def _hours(text: str) -> float:
    try:
        hours = float(text)
    except ValueError:
        hours = -1.0
    if not 0.0 <= hours < 1e6:
        raise argparse.ArgumentTypeError(f"found {text!r}; expected a number from 0, such as 120")
    return hours


def _seed(text: str) -> int:
    if not text.isdecimal():
        raise argparse.ArgumentTypeError(f"found {text!r}; expected a whole number of at least 0")
    return int(text)
