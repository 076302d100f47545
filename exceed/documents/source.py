"""YAML text -> plain data that remembers line and column of every key and value.

Scalars are handed on as text: no word becomes a bool, no digits an octal number, no `12:30` a 750; plain `null`, `~`
and nothing mean absent. Built from the parser's events with a stack of our own, so neither deep nesting nor aliases
can exhaust the machine. Everything that is wrong raises `DocumentError` with `file:line:column`.
"""

from __future__ import annotations

import hashlib
import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import yaml

from exceed.documents.reading import NOT_TEXT, clean, read_text, syntax
from exceed.errors import DocumentError, Problem

MAXIMUM_DEPTH = 32
MAXIMUM_NODES = 50_000

_Loader: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
_QUOTES = ("'", '"', "|", ">")
_ABSENT = {"", "~", "null", "Null", "NULL"}
_DATE = re.compile(r"\d{4}-\d{2}-\d{2}([T ]\d{2}:\d{2}.*)?$")
_BEFORE_COMMA = re.compile(r"[+-]?\d+$", re.ASCII)
_AFTER_COMMA = re.compile(r"\d+(\s*[A-Za-z%°/].*)?$", re.ASCII)


@dataclass(slots=True, eq=False)
class Node:
    """A place in the text. `line` and `column` count from 1."""

    line: int
    column: int


@dataclass(slots=True, eq=False)
class Scalar(Node):
    """Text as written; `quoted` tells "null" from null."""

    text: str = ""
    quoted: bool = False

    @property
    def absent(self) -> bool:
        return not self.quoted and self.text in _ABSENT


@dataclass(slots=True, eq=False)
class Sequence(Node):
    items: list[Node] = field(default_factory=list)


@dataclass(slots=True, eq=False)
class Mapping(Node):
    """`entries`: key -> value; `keys`: key -> the place of the key itself."""

    entries: dict[str, Node] = field(default_factory=dict)
    keys: dict[str, Node] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, eq=False)
class Document:
    """One YAML file: its name as the user gave it, its nodes, and the digest of its bytes.

    `problems` are faults of the text that did not keep it from being understood; `documents.build` raises them
    together with those of the content, so that all are listed at once.
    """

    name: str
    root: Mapping
    sha256: str
    text: str
    problems: tuple[Problem, ...] = ()

    def place(self, node: Node | None) -> str:
        return f"{self.name}:{node.line}:{node.column}" if node is not None else self.name

    @property
    def format(self) -> str:
        node = self.root.entries.get("format")
        return node.text if isinstance(node, Scalar) else ""


def plain(node: Node) -> Any:
    """The node as dict, list and text; a key whose value is absent is left out, an absent list item is None."""
    if isinstance(node, Mapping):
        return {
            key: plain(value) for key, value in node.entries.items() if not (isinstance(value, Scalar) and value.absent)
        }
    if isinstance(node, Sequence):
        return [None if isinstance(item, Scalar) and item.absent else plain(item) for item in node.items]
    return node.text if isinstance(node, Scalar) else None


def load(path: Path | str, name: str | None = None) -> Document:
    """Read and parse one file. `name` is how messages call it."""
    shown = name or str(path)
    text, data = read_text(path, shown)
    return parse(text, shown, hashlib.sha256(data).hexdigest())


def parse(text: str, name: str = "text", sha256: str = "") -> Document:
    """Parse YAML text. Raises DocumentError where nothing can be made of it; lesser faults go along as data."""
    digest = sha256 or hashlib.sha256(text.encode("utf-8", errors="surrogatepass")).hexdigest()
    builder = _Builder(name, clean(text.removeprefix("\ufeff"), name))
    try:
        for event in yaml.parse(builder.text, Loader=_Loader):
            builder.take(event)
    except yaml.YAMLError as error:
        raise DocumentError(*builder.problems, syntax(error, name, text)) from error
    except RecursionError:
        raise DocumentError(
            Problem(
                name,
                "the text is nested too deeply",
                f"at most {MAXIMUM_DEPTH} levels",
                "check that this is the right file",
            )
        ) from None
    root = builder.root
    do = "'exceed template KIND' prints a file to start from"
    if root is None or (isinstance(root, Scalar) and root.absent):
        raise DocumentError(*builder.problems, Problem(f"{name}:1:1", "the file is empty", "a first key 'format'", do))
    if not isinstance(root, Mapping):
        raise DocumentError(
            *builder.problems,
            Problem(
                f"{name}:{root.line}:{root.column}",
                "the file is no mapping of keys to values",
                "a first key 'format'",
                do,
            ),
        )
    _count(root, name)
    return Document(name, root, digest, text, tuple(builder.problems))


class _Builder:
    """Makes nodes from parser events; its own stack bounds the depth."""

    def __init__(self, name: str, text: str) -> None:
        self.name = name
        self.text = text
        self.root: Node | None = None
        self.problems: list[Problem] = []
        self._documents = 0
        self._nodes = 0
        self._anchors: dict[str, Node] = {}
        self._open: list[tuple[Node, list[tuple[Node, bool, int, int]]]] = []

    def _problem(self, mark: Any, problem: str, expected: str, do: str) -> None:
        self.problems.append(Problem(f"{self.name}:{mark.line + 1}:{mark.column + 1}", problem, expected, do))

    def take(self, event: Any) -> None:
        mark = event.start_mark
        if isinstance(event, yaml.DocumentStartEvent):
            self._documents += 1
            if self._documents == 2:
                self._problem(
                    mark,
                    "a second document starts here",
                    "one document in a file",
                    "put it in a file of its own, or remove the '---'",
                )
        if self._documents > 1:
            return
        if isinstance(event, yaml.AliasEvent):
            self._alias(event)
        elif isinstance(event, yaml.ScalarEvent):
            self._tag(event)
            node = Scalar(mark.line + 1, mark.column + 1, self._plain(event), event.style in _QUOTES)
            self._anchor(event, node)
            end: Any = event.end_mark
            self._add(node, node.quoted, mark.index, end.index)
        elif isinstance(event, yaml.SequenceStartEvent | yaml.MappingStartEvent):
            self._tag(event)
            line, column = mark.line + 1, mark.column + 1
            made: Node = Sequence(line, column) if isinstance(event, yaml.SequenceStartEvent) else Mapping(line, column)
            self._anchor(event, made)
            self._open.append((made, []))
            if len(self._open) > MAXIMUM_DEPTH:
                raise DocumentError(
                    Problem(
                        f"{self.name}:{mark.line + 1}:{mark.column + 1}",
                        f"more than {MAXIMUM_DEPTH} levels of nesting",
                        f"at most {MAXIMUM_DEPTH}",
                        "check that this is the right file",
                    )
                )
        elif isinstance(event, yaml.SequenceEndEvent | yaml.MappingEndEvent):
            whole, parts = self._open.pop()
            if isinstance(whole, Sequence):
                self._sequence(whole, parts)
            elif isinstance(whole, Mapping):
                self._mapping(whole, parts)
            self._add(whole, True, -1, -1)

    def _plain(self, event: Any) -> str:
        """The text of a scalar; a control character that an escape has smuggled in is told and replaced."""
        text: str = event.value
        found = NOT_TEXT.search(text)
        if found is None:
            return text
        code = ord(found.group())
        self._problem(
            event.start_mark,
            f"an escape makes a control character (U+{code:04X}) here",
            "plain text",
            "remove the escape",
        )
        return NOT_TEXT.sub("\ufffd", text)

    def _tag(self, event: Any) -> None:
        tag = event.tag
        if tag is None or tag in ("!", "tag:yaml.org,2002:str", "tag:yaml.org,2002:map", "tag:yaml.org,2002:seq"):
            return
        self._problem(event.start_mark, f"tag '{tag}' is not known", "plain YAML without tags", "remove the tag")

    def _anchor(self, event: Any, node: Node) -> None:
        self._nodes += 1
        if self._nodes > MAXIMUM_NODES:
            raise DocumentError(
                Problem(
                    f"{self.name}:{node.line}:{node.column}",
                    f"the file has more than {MAXIMUM_NODES} values",
                    f"at most {MAXIMUM_NODES}",
                    "check that this is the right file",
                )
            )
        if event.anchor is not None:
            self._anchors[event.anchor] = node

    def _alias(self, event: Any) -> None:
        target = self._anchors.get(event.anchor)
        mark = event.start_mark
        if target is None:
            self._problem(
                mark,
                f"alias '*{event.anchor}' has no anchor before it",
                f"'&{event.anchor}' further up",
                "write the value out",
            )
            target = Scalar(mark.line + 1, mark.column + 1, "", False)
        elif any(target is made for made, _ in self._open):
            self._problem(mark, f"alias '*{event.anchor}' contains itself", "a value that ends", "write the value out")
            target = Scalar(mark.line + 1, mark.column + 1, "", False)
        self._add(target, True, -1, -1)

    def _add(self, node: Node, quoted: bool, start: int, end: int) -> None:
        if self._open:
            self._open[-1][1].append((node, quoted, start, end))
        else:
            self.root = node

    def _sequence(self, made: Sequence, parts: list[tuple[Node, bool, int, int]]) -> None:
        index = 0
        while index < len(parts):
            item = parts[index][0]
            if index + 1 < len(parts) and (whole := self._decimal_comma(parts[index], parts[index + 1], True)):
                item = whole
                index += 1
            made.items.append(item)
            index += 1

    def _decimal_comma(
        self, first: tuple[Node, bool, int, int], second: tuple[Node, bool, int, int], listed: bool
    ) -> Scalar | None:
        """The value meant where '4,4 g' was torn in two: digits, a comma, and digits at once, all unquoted."""
        one, two = first[0], second[0]
        if not (isinstance(one, Scalar) and isinstance(two, Scalar)) or first[1] or second[1]:
            return None
        if second[2] - first[3] != 1 or self.text[first[3] : second[2]] != ",":
            return None
        if not (_BEFORE_COMMA.match(one.text) and _AFTER_COMMA.match(two.text)):
            return None
        # [0,10] may well be two numbers
        if listed and two.text.isdigit():
            return None
        whole = f"{one.text},{two.text}"
        self.problems.append(
            Problem(
                f"{self.name}:{one.line}:{one.column}",
                f"'{whole}' has a decimal comma",
                "a decimal point; inside braces and brackets a comma parts the values",
                f"write '{one.text}.{two.text}'",
            )
        )
        return Scalar(one.line, one.column, f"{one.text}.{two.text}")

    def _mapping(self, made: Mapping, parts: list[tuple[Node, bool, int, int]]) -> None:
        last = ""
        for index in range(0, len(parts) - 1, 2):
            key, value = parts[index][0], parts[index + 1][0]
            if not isinstance(key, Scalar):
                self.problems.append(
                    Problem(
                        f"{self.name}:{key.line}:{key.column}",
                        "a list or mapping stands where a key is due",
                        "a key that is a word",
                        "write 'key: value'",
                    )
                )
                continue
            if index and (whole := self._decimal_comma(parts[index - 1], parts[index], False)):
                if last in made.entries:
                    made.entries[last] = whole
                continue
            if key.text in made.entries:
                before = made.keys[key.text]
                self.problems.append(
                    Problem(
                        f"{self.name}:{key.line}:{key.column}",
                        f"key '{key.text}' is there twice, first in line {before.line}",
                        "each key once",
                        "remove one of them",
                    )
                )
                continue
            if key.text == "<<" and not key.quoted:
                self.problems.append(
                    Problem(
                        f"{self.name}:{key.line}:{key.column}",
                        "merge key '<<' is not read",
                        "keys written out",
                        "write the merged keys out",
                    )
                )
                continue
            last = key.text
            made.entries[key.text] = value
            made.keys[key.text] = key


def _count(root: Mapping, name: str) -> None:
    """Refuse a text whose aliases expand beyond the bounds; sizes are summed once per node, not by walking copies."""
    sizes: dict[int, tuple[int, int]] = {}

    def size(node: Node) -> tuple[int, int]:
        known = sizes.get(id(node))
        if known is None:
            children: list[Node] = []
            if isinstance(node, Mapping):
                children = list(node.entries.values())
            elif isinstance(node, Sequence):
                children = node.items
            inner = [size(child) for child in children]
            known = 1 + sum(count for count, _ in inner), 1 + max((depth for _, depth in inner), default=0)
            sizes[id(node)] = known
            if known[0] > MAXIMUM_NODES or known[1] > MAXIMUM_DEPTH:
                raise DocumentError(
                    Problem(
                        f"{name}:{node.line}:{node.column}",
                        "aliases make this expand to more values or levels than are read",
                        f"at most {MAXIMUM_NODES} values and {MAXIMUM_DEPTH} levels",
                        "write the values out",
                    )
                )
        return known

    size(root)


def unquoted_dates(document: Document) -> list[Problem]:
    """Advice: dates that other YAML readers would turn into something else."""
    found: list[Problem] = []
    seen: set[int] = set()
    stack: list[Node] = [document.root]
    while stack:
        node = stack.pop()
        if id(node) in seen:
            continue
        seen.add(id(node))
        if isinstance(node, Mapping):
            stack.extend(node.entries.values())
        elif isinstance(node, Sequence):
            stack.extend(node.items)
        elif isinstance(node, Scalar) and not node.quoted and _DATE.match(node.text):
            found.append(
                Problem(
                    document.place(node),
                    f"date {node.text} is not quoted",
                    f'"{node.text}"',
                    "quote it, so that every YAML reader keeps it as written",
                )
            )
    return sorted(found, key=lambda problem: [int(part) for part in problem.place.rsplit(":", 2)[1:]])
