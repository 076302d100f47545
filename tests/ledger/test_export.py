"""A de-identified export holds none of the originals; the key decides whether two exports can be joined."""

from __future__ import annotations

import json
import re
from datetime import timedelta

import pytest

from exceed.errors import UsageError
from exceed.ledger import acts
from exceed.ledger.export import export, export_deidentified, read_key
from exceed.ledger.record import record
from exceed.ledger.store import open_ledger
from ledger.days import DAY, event, recording, summary

KEY = b"0123456789abcdef0123456789abcdef"
NOW = DAY.timestamp() + 86400.0
# words of the formats themselves: they say nothing of anybody
OURS = {
    "above", "established", "caution", "warning", "advisory", "manoeuvring", "load_factor", "agreed", "exceed", "0.1.0",
    "event", "events", "due", "closed", "to_be_decided", "possible", "airborne",
    "exceed/ledger-export/1",
}  # fmt: skip


@pytest.fixture
def book(tmp_path):
    with open_ledger(f"sqlite:///{tmp_path / 'ledger.sqlite'}", create=True) as opened:
        rows = [
            recording(
                f"Quillfeather/sortie-{turn}.csv", day=DAY + timedelta(days=turn), start=9.0 * 3600.0 + 17.0 * turn,
                registration="ZZ-NMA", events=[event(812.131 + turn, 815.947 + turn, notes=["told by Quillfeather"])],
            )
            for turn in range(7)
        ]  # fmt: skip
        own = {"rule": "quillfeathers-rule", "quantity": "quillfeathers_gauge"}
        rare = recording(
            "c.csv", registration="ZZ-NMC", events=[event(100.0, 101.0, severity="warning", value=9.8765, **own)]
        )
        record(opened, summary(*rows, rare))
        first = opened.reading(lambda table: export(table, NOW))["events"][0]
        acts.decide(opened, first["id"], "agreed", "Zacharias Quillfeather", "landing at Quillfeather Field")
        inspection = opened.reading(lambda table: export(table, NOW))["inspections"][0]
        acts.close(opened, inspection["id"], "Zacharias Quillfeather", "WO-31-204")
        acts.set_totals(opened, "ZZ-NMA", 1234.5, 2210, NOW, "Zacharias Quillfeather")
        yield opened


def shared(book, key=KEY, least=5):
    return book.reading(lambda table: export_deidentified(table, key, least, NOW))


def originals(node):
    """Every text and every number with a fraction in the full export."""
    if isinstance(node, dict):
        for value in node.values():
            yield from originals(value)
    elif isinstance(node, list):
        for value in node:
            yield from originals(value)
    elif isinstance(node, str):
        yield node
    elif isinstance(node, float) and len(f"{abs(node):.6f}".rstrip("0").split(".")[1]) >= 3:
        yield str(node)


def test_none_of_the_originals_is_in_a_deidentified_export(book):
    full = book.reading(lambda table: export(table, NOW))
    cautions = set(full.pop("cautions"))
    words = {text for text in originals(full) if len(text) >= 3 and text not in OURS | cautions and text != "normal"}
    assert len(words) > 60
    made = shared(book)
    for key in ("removed", "suppressed", "cautions"):
        made.pop(key)
    text = json.dumps(made).lower()
    assert [word for word in sorted(words) if word.lower() in text] == []
    for hidden in ("quillfeather", "nma", "nmc", "2031", "larkspur", "51.98"):
        assert hidden not in text
    # no digest, no id, no date can hide in it: long hex and dashes stand only in the names made by the key
    assert re.findall(r"[0-9a-f]{11,}|\d{4}-\d\d", re.sub(r"(aeroplane|rule)-[0-9a-f]{10}", "", text)) == []


def test_what_was_removed_is_listed(book):
    made = shared(book)
    listed = " ".join(made["removed"])
    for word in ("registrations", "dates", "names of people", "paths", "positions", "free text"):
        assert word in listed
    assert "1 to 4" in made["suppressed"]


def test_small_counts_are_not_given_and_their_events_left_out(book):
    made = shared(book)
    assert [row["events"] for row in made["counts"]].count(7) == 1
    assert [row["events"] for row in made["counts"]].count(None) == 1
    assert len(made["events"]) == 7
    assert {row["severity"] for row in made["events"]} == {"caution"}
    assert made["events_left_out"] is None
    assert len(shared(book, least=1)["events"]) == 8
    (few,) = [row for row in made["aeroplanes"] if row["flights"] is None]
    assert few["flight_h"] is None


def test_a_key_decides_which_exports_can_be_joined(book, tmp_path):
    one = {row["aeroplane"] for row in shared(book)["aeroplanes"]}
    assert one == {row["aeroplane"] for row in shared(book)["aeroplanes"]}
    assert not one & {row["aeroplane"] for row in shared(book, key=KEY[::-1])["aeroplanes"]}
    assert read_key(None) != read_key(None)
    file = tmp_path / "key"
    file.write_bytes(KEY + b"\n")
    assert read_key(file) == KEY
    file.write_bytes(b"short")
    with pytest.raises(UsageError, match="at least 16"):
        read_key(file)
    with pytest.raises(UsageError, match="cannot be read"):
        read_key(tmp_path / "nothing")


def test_a_full_export_holds_what_the_lists_show(book):
    full = book.reading(lambda table: export(table, NOW))
    assert full["deidentified"] is False
    assert len(full["events"]) == 8
    assert [row["registration"] for row in full["totals"]] == ["ZZ-NMA", "ZZ-NMC"]
