"""YAML to a plain tree that remembers lines and keeps every scalar as the text that was written.

The usual Python loader turns ``12:30:45`` into 45045, ``NO`` into False and ``0123`` into 83, and
lets a repeated key win silently. Here the parser's events are used directly: a scalar stays text
(the schema alone decides what is a number), a repeated key is refused, tags are refused, so that
nothing in a file can make an object, and depth and aliases are limited. No recursion.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace

import yaml

from planner.base.errors import InputError, Problem
from planner.base.quantities import shown

__all__ = ["Node", "Place", "Value", "line_of", "node_at", "parse", "plain"]

_DEEPEST = 40
_MOST_ALIASED = 100_000
_MOST_PROBLEMS = 1000
_NULLS = frozenset({"", "~", "null", "Null", "NULL"})
_LOADER = getattr(yaml, "CSafeLoader", yaml.SafeLoader)

Place = tuple[str | int, ...]
"""Keys and list positions (from 0) that lead to a place in the tree."""


@dataclass(frozen=True, slots=True)
class Node:
    """One value and the line of its key (or of itself, inside a list)."""

    line: int | None
    value: Value


Value = str | None | list[Node] | dict[str, Node]


@dataclass(slots=True)
class _Open:
    """A mapping or list whose end has not come yet."""

    line: int
    value: list[Node] | dict[str, Node]
    anchor: str | None
    size: int = 1
    height: int = 1
    key: tuple[str, int] | None = None


@dataclass(frozen=True, slots=True)
class _Built:
    """A finished value, how many values it holds and how deep they are nested."""

    node: Node
    size: int = 1
    height: int = 0


@dataclass(slots=True)
class _Builder:
    """Puts the tree together from parser events."""

    file: str
    problems: list[Problem] = field(default_factory=list)
    root: Node | None = None
    documents: int = 0
    aliased: int = 0
    open: list[_Open] = field(default_factory=list)
    anchors: dict[str, _Built | None] = field(default_factory=dict)

    def fault(self, line: int, key: str, found: str, expected: str) -> None:
        self.problems.append(Problem(self.file, line, shown(key) if key else "", found, expected))
        if len(self.problems) >= _MOST_PROBLEMS:
            raise InputError(self.problems)

    def stop(self, line: int, found: str, expected: str) -> None:
        self.fault(line, "", found, expected)
        raise InputError(self.problems)

    def take(self, event: yaml.Event) -> None:
        line = event.start_mark.line + 1 if event.start_mark else 1
        match event:
            case yaml.DocumentStartEvent():
                self.documents += 1
                if self.documents > 1:
                    self.stop(line, "a second document (`---`)", "one document in a file")
            case yaml.ScalarEvent():
                self.refuse_tag(event, line)
                if any("\ud800" <= c <= "\udfff" for c in event.value):
                    self.stop(line, "half a character (\\ud800 to \\udfff)", "the character itself")
                null = not event.style and event.value in _NULLS
                self.place(_Built(Node(line, None if null else event.value)), event.anchor)
            case yaml.MappingStartEvent() | yaml.SequenceStartEvent():
                self.refuse_tag(event, line)
                self.limit_depth(line, 1)
                if event.anchor:
                    self.anchors[event.anchor] = None  # open: an alias to it would be endless
                is_map = isinstance(event, yaml.MappingStartEvent)
                self.open.append(_Open(line, {} if is_map else [], event.anchor))
            case yaml.MappingEndEvent() | yaml.SequenceEndEvent():
                done = self.open.pop()
                node = Node(done.line, done.value)
                self.place(_Built(node, done.size, done.height), done.anchor)
            case yaml.AliasEvent():
                self.alias(event.anchor or "", line)

    def limit_depth(self, line: int, height: int) -> None:
        if len(self.open) + height > _DEEPEST:
            self.stop(line, "lists or sections nested too deep", f"at most {_DEEPEST} levels")

    def refuse_tag(self, event: yaml.ScalarEvent | yaml.CollectionStartEvent, line: int) -> None:
        if event.tag is not None:
            tag = str(event.tag).replace("tag:yaml.org,2002:", "!!")[:60]
            self.fault(line, "", f"the YAML tag {tag}", "plain text, lists and sections only")

    def alias(self, name: str, line: int) -> None:
        held = self.anchors.get(name)
        if held is None:
            why = "inside itself" if name in self.anchors else "that is not defined above it"
            self.fault(line, "", f"the alias *{name} {why}", "an anchor that is complete")
            held = _Built(Node(line, None))
        self.limit_depth(line, held.height)
        self.aliased += held.size
        if self.aliased > _MOST_ALIASED:
            limit = f"at most {_MOST_ALIASED} in all"
            self.stop(line, "aliases that unfold to too many values", limit)
        self.place(replace(held, node=replace(held.node, line=line)), None)

    def place(self, built: _Built, anchor: str | None) -> None:
        """Put a finished value where it belongs: root, list, key or value of a mapping."""
        if anchor:
            self.anchors[anchor] = built
        node = built.node
        if not self.open:
            self.root = node
            return
        parent = self.open[-1]
        parent.size += built.size
        parent.height = max(parent.height, built.height + 1)
        if isinstance(parent.value, list):
            parent.value.append(node)
        elif parent.key is None:
            parent.key = (self.key_text(node), node.line or 0)
        else:
            (key, line), parent.key = parent.key, None
            first = parent.value.get(key)
            if first is not None:
                found = f"the key is given twice, on lines {first.line} and {line}"
                self.fault(line, key, found, "each key once")
            else:
                parent.value[key] = replace(node, line=line)

    def key_text(self, node: Node) -> str:
        if node.value == "<<":
            self.fault(node.line or 0, "<<", "merging with `<<`", "every key written out")
        if isinstance(node.value, list | dict):
            self.fault(node.line or 0, "", "a list or section as a key", "a word as key")
            return ""
        return node.value or ""


def parse(text: str, file: str) -> Node:
    """Read one YAML document.

    Parameters
    ----------
    text : str
        The file's content.
    file : str
        Its name, for messages.

    Returns
    -------
    Node
        The tree. Scalars are text exactly as written, or None where nothing (or ``null``) stands.

    Raises
    ------
    InputError
        With every repeated key and tag, or with the first place where the text is no YAML, is
        nested too deep, or unfolds to too much.
    """
    builder = _Builder(file)
    try:
        for event in yaml.parse(text, Loader=_LOADER):
            builder.take(event)
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        line = mark.line + 1 if mark else 1
        if "nesting" in str(error.problem):  # the compiled parser's own limit
            builder.limit_depth(line, _DEEPEST + 1)
        builder.stop(line, f"not valid YAML ({error.problem})", _advice(text, line))
    except yaml.YAMLError:
        builder.stop(1, "not valid YAML (a character that is not allowed)", "plain UTF-8 text")
    if builder.problems:
        raise InputError(builder.problems)
    if builder.root is None:
        builder.stop(1, "nothing but comments", "`key: value` lines")
    assert builder.root is not None
    return builder.root


def _advice(text: str, line: int) -> str:
    lines = text.splitlines()
    near = lines[max(line - 2, 0) : line]
    if any("\t" in one[: len(one) - len(one.lstrip())] for one in near):
        return "spaces, not tabs, at the start of a line"
    return "`key: value` lines, and quotes around text that holds `: ` or starts with a sign"


def node_at(root: Node, path: Place) -> Node | None:
    """Return the node at `path`, or None."""
    return list(_along(root, path))[-1]


def line_of(root: Node, path: Place) -> int | None:
    """Return the line of `path`, or of the nearest section around it that is in the file."""
    line = None
    for node in _along(root, path):
        line = node.line if node else line
    return line


def _along(root: Node, path: Place) -> Iterator[Node | None]:
    """Yield the nodes from `root` to `path`; None from where the path leaves the tree."""
    node: Node | None = root
    yield node
    for step in path:
        value = node.value if node else None
        if isinstance(value, dict):
            node = value.get(str(step))
        elif isinstance(value, list) and isinstance(step, int) and step < len(value):
            node = value[step]
        else:
            node = None
        yield node


def plain(node: Node) -> object:
    """Return the tree without lines; a key with nothing behind it counts as left out."""
    if isinstance(node.value, dict):
        return {key: plain(n) for key, n in node.value.items() if n.value is not None}
    if isinstance(node.value, list):
        return [plain(n) for n in node.value]
    return node.value
