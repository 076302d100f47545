"""Load rule sets, by name or from a file, and put several on top of one another."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field, replace
from pathlib import Path

from exceed.core.quantities import Quantity
from exceed.core.units import UNITS
from exceed.documents import rules as rules_module
from exceed.documents.build import build, open_document
from exceed.documents.fields import nearest
from exceed.documents.rules import Rule, RuleSet
from exceed.documents.source import Document, Mapping, Scalar, Sequence, load
from exceed.errors import DocumentError, Problem

BUILT_IN = ("airframe", "aerobatic", "handling", "landing", "gust", "engine")


def folder() -> Path:
    """Where the built-in sets are: in the installed package, else beside it in the repository."""
    package = Path(rules_module.__file__).resolve().parent.parent
    inside = package / "rules"
    return inside if inside.is_dir() else package.parent / "rules"


def load_rules(origin: Path | str | Document, name: str | None = None) -> RuleSet:
    """A built-in set by its name, else a file, or text with line breaks. Raises DocumentError with all problems."""
    if isinstance(origin, str) and origin in BUILT_IN:
        document = load(folder() / f"{origin}.yaml", f"{origin}.yaml")
        shown, path = origin, origin
    else:
        if isinstance(origin, str) and "\n" not in origin and not Path(origin).exists() and _is_word(origin):
            near = nearest(origin, BUILT_IN)
            raise DocumentError(
                Problem(
                    origin,
                    "there is no rule set and no file of this name",
                    f"a file, or one of {', '.join(sorted(BUILT_IN))}",
                    f"write '{near}' if that is meant" if near else "check the name",
                )
            )
        document = open_document(origin, name)
        shown, path = document.name, document.name
    own = document.root.entries.get("quantities")
    declared: dict[str, str] = {}
    if isinstance(own, Mapping):
        declared = {key: node.text for key, node in own.entries.items() if isinstance(node, Scalar)}
    # twice the same id is told even where the rules themselves have faults
    document = replace(document, problems=(*document.problems, *_twice(document)))
    made = build(RuleSet, document, "rules", {"declared": declared})
    listed = document.root.entries.get("rules")
    nodes = listed.items if isinstance(listed, Sequence) else []
    placed = tuple(
        rule.model_copy(
            update={
                "place": document.place(node.entries.get("id", node) if isinstance(node, Mapping) else node),
                "rule_set": shown,
            }
        )
        for rule, node in zip(made.rules, nodes, strict=True)
    )
    return made.model_copy(
        update={"rules": placed, "name": shown, "path": path, "sha256": document.sha256, "title": made.title or shown}
    )


def _twice(document: Document) -> list[Problem]:
    listed = document.root.entries.get("rules")
    seen: dict[str, int] = {}
    found: list[Problem] = []
    for index, row in enumerate(listed.items if isinstance(listed, Sequence) else []):
        node = row.entries.get("id") if isinstance(row, Mapping) else None
        if not isinstance(node, Scalar):
            continue
        name = node.text.strip()
        if name in seen:
            problem = f"id '{name}' is there twice, first as rule {seen[name] + 1}"
            found.append(
                Problem(document.place(node), problem, "each id once in a file", "give one of them another id")
            )
        seen.setdefault(name, index)
    return found


def _is_word(text: str) -> bool:
    return "/" not in text and "\\" not in text and not text.endswith((".yaml", ".yml"))


@dataclass(frozen=True, slots=True)
class Replaced:
    """A later set's rule took the place of an earlier one's."""

    rule: str
    earlier: str
    later: str

    def __str__(self) -> str:
        return f"rule '{self.rule}' of {self.earlier} is replaced by that of {self.later}"


@dataclass(frozen=True, slots=True)
class RuleBook:
    """All rules in force, in order; `replaced` and `notes` must be said in every output."""

    sets: tuple[RuleSet, ...]
    rules: tuple[Rule, ...]
    replaced: tuple[Replaced, ...] = ()
    notes: tuple[str, ...] = ()
    quantities: dict[str, str] = field(default_factory=dict)

    def find(self, name: str) -> Quantity | None:
        """Row of a quantity, known or declared in one of the sets."""
        return rules_module.find(name, self.quantities)


def layer(sets: Iterable[RuleSet]) -> RuleBook:
    """Put sets on top of one another, later ones over earlier ones.

    The very same rule in two sets counts once. A later rule of the same id replaces the earlier one if it says
    `override: true`, and is an error otherwise. The same file given twice counts once, and is noted. Raises
    DocumentError with all problems.
    """
    problems: list[Problem] = []
    notes: list[str] = []
    replaced: list[Replaced] = []
    taken: list[RuleSet] = []
    rules: dict[str, Rule] = {}
    quantities: dict[str, str] = {}
    owner: dict[str, str] = {}
    for one in sets:
        if any(one.sha256 and one.sha256 == other.sha256 for other in taken):
            notes.append(f"rule set {one.name} is given twice and counts once")
            continue
        taken.append(one)
        for name, unit in one.quantities.items():
            if name in quantities and UNITS[unit].kind != UNITS[quantities[name]].kind:
                problems.append(
                    Problem(
                        one.path,
                        f"quantity '{name}' is in {unit} here and in {quantities[name]} in {owner[name]}",
                        "one kind of unit for a name",
                        "rename one of them",
                    )
                )
            quantities.setdefault(name, unit)
            owner.setdefault(name, one.name)
        for rule in one.rules:
            before = rules.get(rule.id)
            if before is None:
                if rule.override:
                    notes.append(
                        f"rule '{rule.id}' of {one.name} says 'override' and there is no earlier rule of this id"
                    )
            elif _same(rule, before):
                continue
            elif rule.override:
                replaced.append(Replaced(rule.id, before.rule_set or "an earlier set", rule.rule_set or one.name))
            else:
                problems.append(
                    Problem(
                        rule.place or one.path,
                        f"id '{rule.id}' is there already, in {before.place or before.rule_set}",
                        "each id once, or 'override: true'",
                        "give it another id, or write 'override: true' to replace the earlier rule",
                    )
                )
                continue
            rules[rule.id] = rule
    if problems:
        raise DocumentError(*problems)
    return RuleBook(tuple(taken), tuple(rules.values()), tuple(replaced), tuple(notes), quantities)


def _same(one: Rule, other: Rule) -> bool:
    """Whether two rules differ in nothing but where they stand."""
    blank = {"place": "", "rule_set": "", "override": False}
    return one.model_copy(update=blank) == other.model_copy(update=blank)
