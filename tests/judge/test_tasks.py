"""Which inspection an event asks for, and how surely."""

from __future__ import annotations

import pytest

from exceed.judge.compiled import TaskSpec

BOTH = [("caution", "established"), ("warning", "likely")]


@pytest.mark.parametrize(
    ("severity", "certainty", "steps", "wanted"),
    [
        # a limit surely passed asks for it though the warning level may only have been passed
        ("caution", "established", BOTH, True),
        ("warning", "established", BOTH, False),
        ("warning", "likely", BOTH, True),
        ("caution", "possible", [("advisory", "established")], False),
        ("caution", "possible", [("advisory", "established"), ("caution", "doubtful")], False),
        ("advisory", "possible", [("advisory", "possible")], True),
    ],
)
def test_one_level_that_is_severe_and_sure_enough_asks_for_an_inspection(
    severity: str, certainty: str, steps: list[tuple[str, str]], wanted: bool
) -> None:
    spec = TaskSpec("look", "05-50", None, severity, certainty)
    assert spec.of(steps).wanted is wanted
