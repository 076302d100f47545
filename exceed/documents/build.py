"""A parsed document -> a checked model, with every problem of the file listed at once, each at its line and column."""

from __future__ import annotations

from pathlib import Path
from typing import Any, TypeVar

from pydantic import ValidationError

from exceed.documents import source
from exceed.documents.fields import Model, faults_of, nearest
from exceed.documents.source import Document, Mapping, Node, Scalar, Sequence
from exceed.errors import DocumentError, Problem

M = TypeVar("M", bound=Model)

KINDS = ("aircraft", "rules", "channels", "loading", "fleet")
# each round takes out what was found wrong and looks at the rest again
_ROUNDS = 12
# how a fault speaks of what is not there
_ABSENCE = ("there is none", "is missing", "are missing", "neither", "no level is given", "needs one of")


def open_document(origin: Path | str | Document, name: str | None = None) -> Document:
    """A path is read, text with a line break in it is parsed, a Document is taken as it is."""
    if isinstance(origin, Document):
        return origin
    if isinstance(origin, str) and "\n" in origin:
        return source.parse(origin, name or "text")
    return source.load(origin, name)


def check_format(document: Document, kind: str) -> None:
    """Raises DocumentError unless the first key says `format: exceed-KIND/1`."""
    wanted = f"exceed-{kind}/1"
    node = document.root.entries.get("format")
    said = document.format
    if node is None:
        raise DocumentError(
            Problem(
                document.place(document.root),
                "key 'format' is missing",
                f"'format: {wanted}' as first key",
                f"write 'format: {wanted}' into the first line",
            )
        )
    if said != wanted:
        known = [f"exceed-{one}/1" for one in KINDS]
        if said in known:
            do = "give this file where it belongs"
        else:
            near = nearest(said, known)
            do = f"write '{near}'" if near else f"write '{wanted}'"
        raise DocumentError(Problem(document.place(node), f"'{said}' is not the format due here", wanted, do))


def build(model: type[M], document: Document, kind: str, context: dict[str, Any] | None = None) -> M:
    """Check a document against its model. Raises DocumentError with all problems, in the order of the text."""
    check_format(document, kind)
    context = dict(context or {})
    root = _copy(document.root)
    thinned: list[Node] = []  # what lost a part that was found wrong; kept, so that identities stay unique
    loosened: list[Node] = []  # what lost only a key that is not known
    problems: dict[tuple[int, int, str], Problem] = {}
    for problem_of_text in document.problems:
        line, column = problem_of_text.place.rsplit(":", 2)[1:]
        problems[(int(line), int(column), problem_of_text.problem)] = problem_of_text
    for _ in range(_ROUNDS):
        try:
            made = model.model_validate(source.plain(root), context={**context, "document": document})
        except ValidationError as error:
            cut: list[tuple[Node, str | int, bool]] = []
            for row in error.errors(include_url=False):
                for path, problem, expected, do in faults_of(row):
                    parents, node, key_node = _walk(root, (*row["loc"], *path))
                    # of a whole that lost a wrong part nothing more can be said, nor that the part is missing
                    absence = any(words in problem for words in _ABSENCE)
                    around = [node, *(parent for parent, _ in parents), *_children(node)] if absence else [node]
                    gone = [*thinned, *loosened] if absence else thinned
                    if not any(one is whole for one in around for whole in gone):
                        at = key_node if key_node is not None and _at_key(node, row["type"], problem) else node
                        shown = Problem(document.place(at), problem, expected, do)
                        problems.setdefault((at.line, at.column, problem), shown)
                    if parents:
                        cut.append((*parents[-1], "is not known here" not in problem))
            if not _cut(cut, thinned, loosened):
                break
            continue
        if not problems:
            return made
        break
    raise DocumentError(*(problems[key] for key in sorted(problems)))


def _copy(node: Node, depth: int = 0) -> Any:
    """Nodes of our own to take parts out of; aliased parts become separate."""
    if isinstance(node, Mapping):
        entries = {key: _copy(value, depth + 1) for key, value in node.entries.items()}
        return Mapping(node.line, node.column, entries, dict(node.keys))
    if isinstance(node, Sequence):
        return Sequence(node.line, node.column, [_copy(item, depth + 1) for item in node.items])
    return node


def _cut(parts: list[tuple[Node, str | int, bool]], thinned: list[Node], loosened: list[Node]) -> bool:
    """Take wrong parts out of the tree; True if anything was there to be taken."""
    progress = False
    once = {(id(parent), key): (parent, key, counts) for parent, key, counts in parts}
    # from the back, so that places in lists stay right
    for parent, key, counts in sorted(
        once.values(), key=lambda row: row[1] if isinstance(row[1], int) else -1, reverse=True
    ):
        if isinstance(parent, Mapping) and key in parent.entries:
            del parent.entries[str(key)]
        elif isinstance(parent, Sequence) and isinstance(key, int) and key < len(parent.items):
            del parent.items[key]
        else:
            continue
        progress = True
        (thinned if counts else loosened).append(parent)
    return progress


def _children(node: Node) -> list[Node]:
    return list(node.entries.values()) if isinstance(node, Mapping) else []


def _walk(root: Mapping, loc: tuple[Any, ...]) -> tuple[list[tuple[Node, str | int]], Node, Node | None]:
    """Follow a location as far as the text goes; parts that are no place in the text are passed over."""
    node: Node = root
    key_node: Node | None = None
    parents: list[tuple[Node, str | int]] = []
    for part in loc:
        if isinstance(node, Mapping) and isinstance(part, str) and part in node.entries:
            parents.append((node, part))
            key_node = node.keys[part]
            node = node.entries[part]
        elif isinstance(node, Sequence) and isinstance(part, int) and part < len(node.items):
            parents.append((node, part))
            key_node = None
            node = node.items[part]
    return parents, node, key_node


def _at_key(node: Node, kind: str, problem: str) -> bool:
    """A wrong key, or one with nothing after it, is shown at the key; a missing one at its mapping."""
    if isinstance(node, Scalar) and node.absent:
        return True
    return kind == "exceed" and problem.startswith("key '") and "is missing" not in problem
