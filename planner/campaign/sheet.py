"""One input file under way: its tree, and its problems in the observer's words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, TypeVar, get_args

from pydantic import ValidationError

from planner.base.errors import Problem
from planner.base.quantities import shown
from planner.campaign.sections import Section, nearest
from planner.campaign.yaml_nodes import Node, Place, line_of, node_at, plain

__all__ = ["Sheet"]

SomeSection = TypeVar("SomeSection", bound=Section)


@dataclass
class Sheet:
    """One input file's tree, with the place where its problems and notes are gathered."""

    file: str
    root: Node
    problems: list[Problem] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    rows: bool = False
    """The file is a table: its places are rows and columns."""
    wrong: set[str] = field(default_factory=set)
    """Keys that have a problem."""

    def fault(self, path: Place, found: str, expected: str = "") -> None:
        """Note a problem at `path`; only the first of a key, as others may follow from it."""
        key = self.key(path)
        if path and key in self.wrong:
            return
        self.wrong.add(key)
        line, said = line_of(self.root, path), shown(found, 400)
        self.problems.append(Problem(self.file, line, key, said, expected))

    def key(self, path: Place) -> str:
        """Return `path` as an observer names it: list positions count from 1."""
        if self.rows and path:
            row, *column = path
            return ", ".join([f"row {int(row) + 1}", "_".join(map(str, column))][: len(path)])
        steps = [f"[{p + 1}]" if isinstance(p, int) else f".{shown(p)}" for p in path]
        return "".join(steps).removeprefix(".")

    def unknown(self, path: Place, known: Sequence[str], kind: str = "key") -> None:
        """Note a key or name that is not among the known ones."""
        guess = nearest(str(path[-1]), known)
        found = f"unknown {kind}; did you mean `{guess}`?" if guess else f"unknown {kind}"
        self.fault(path, found, "" if guess else f"one of {', '.join(known)}")

    def items(self, path: Place, expected: str) -> list[Place]:
        """Return the places in the list at `path`; none, with the problem noted, if it is wrong."""
        node = node_at(self.root, path)
        if node is None or node.value is None:
            self.fault(path, "missing", expected)
        elif not isinstance(node.value, list):
            found = "one section" if isinstance(node.value, dict) else shown(node.value)
            self.fault(path, found, expected)
        elif not node.value:
            self.fault(path, "an empty list", expected)
        else:
            return [(*path, i) for i in range(len(node.value))]
        return []

    def refuse_twins(self, places: list[Place], kind: str) -> None:
        """Note every name that was given before; names that differ by case alone count as equal."""
        first: dict[str, Place] = {}
        for path in places:
            node = node_at(self.root, (*path, "name"))
            if node is None or not isinstance(node.value, str):
                continue
            name = node.value.strip().casefold()
            if name in first:
                line = line_of(self.root, (*first[name], "name"))
                where = f"on line {line}" if line else f"in {self.key(first[name][:1])}"
                found = f"a second {kind} called {shown(node.value)}, the first is {where}"
                self.fault((*path, "name"), found, "each name once")
            first.setdefault(name, path)

    def read(self, model: type[SomeSection], path: Place) -> SomeSection | None:
        """Return the section at `path`, checked; its problems are noted.

        A section that is missing or empty is read as one with no keys; at the top of the file
        only the model's own keys are read. A section with problems is returned without the keys
        that are wrong, so that the others can still be checked, or is None if they were needed.
        """
        node = node_at(self.root, path)
        value = {} if node is None or node.value is None else plain(node)
        if node is not None and node.value is None and path and isinstance(path[-1], int):
            value = None  # a dash with nothing behind it is no section
        if not isinstance(value, dict):
            self.fault(path, _found(value), f"a section with the keys {', '.join(_keys(model))}")
            return None
        if not path:
            value = {key: value[key] for key in _keys(model) if key in value}
        context = {"notes": self.notes, "where": f"{self.file}: {self.key(path)}".strip(": ")}
        try:
            return model.model_validate(value, context=context)
        except ValidationError as errors:
            for error in errors.errors(include_url=False):
                self._translate(model, path, error["loc"], error)
                _drop(value, error["loc"])
        try:
            return model.model_validate(value, context={**context, "notes": []})
        except ValidationError:
            return None

    def _translate(self, model: type[Section], path: Place, loc: Place, error: Any) -> None:
        """Turn one of pydantic's errors into a problem in the observer's words."""
        place = (*path, *loc)
        inner = _model_at(model, loc[:-1])
        if error["type"] == "extra_forbidden":
            self.unknown(place, _keys(inner) if inner else ())
        elif error["type"] == "missing":
            extra = _field(inner, loc[-1]).json_schema_extra if inner else None
            expected = extra.get("expected", "a value") if isinstance(extra, dict) else "a value"
            self.fault(place, "missing", str(expected))
        elif error["type"] == "value_error":
            found, _, expected = str(error["ctx"]["error"]).partition("; expected ")
            self.fault(place, found, expected)
        else:
            section = _model_at(model, loc)
            expected = f"a section with the keys {', '.join(_keys(section))}" if section else ""
            self.fault(place, _found(error["input"]), expected or error["msg"])


def _drop(section: dict[str, Any], loc: Place) -> None:
    """Take the wrong key out of the section that holds it (a whole list, if it is in one)."""
    *outer, last = loc[: next((i for i, p in enumerate(loc) if isinstance(p, int)), len(loc))]
    for key in outer:
        inner = section.get(str(key))
        if not isinstance(inner, dict):
            return
        section = inner
    section.pop(str(last), None)


def _found(value: object) -> str:
    kinds = {list: "a list", dict: "a section", type(None): "nothing"}
    return kinds.get(type(value)) or shown(str(value))


def _keys(model: type[Section]) -> tuple[str, ...]:
    return tuple(info.alias or name for name, info in model.model_fields.items())


def _field(model: type[Section], key: str | int) -> Any:
    return next(i for n, i in model.model_fields.items() if key in {n, i.alias})


def _model_at(model: type[Section], loc: Place) -> type[Section] | None:
    """Return the class of the section at `loc` inside `model`; None if there is no section."""
    here: type[Section] | None = model
    for step in loc:
        if isinstance(step, int):
            continue  # a list of sections: the class was found at the list's own key
        if here is None or step not in _keys(here):
            return None
        here = _section_in(_field(here, step).annotation)
    return here


def _section_in(annotation: object) -> type[Section] | None:
    """Return the section class inside an annotation such as ``tuple[Annotated[S, ...], ...]``."""
    if isinstance(annotation, type) and issubclass(annotation, Section):
        return annotation
    return next(filter(None, (_section_in(part) for part in get_args(annotation))), None)
