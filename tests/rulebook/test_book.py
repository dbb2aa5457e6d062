"""Loading the rule book: compiled once, kept by content, never trusted blindly."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

from carboy.errors import RuleError
from carboy.rulebook.book import load_rules, read_rule_sources

RULE = "rule one\n  title   A title\n  needs   pH below {figure}\n"
_PROGRAM = """
import sys
from pathlib import Path
from carboy.rulebook.book import load_rules
rules = load_rules(Path(sys.argv[1]))
print(len(rules), 'pyparsing' in sys.modules)
"""


@pytest.fixture
def cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    folder = tmp_path / "cache"
    monkeypatch.setenv("CARBOY_CACHE", str(folder))
    return folder


@pytest.fixture
def book(tmp_path: Path) -> Path:
    folder = tmp_path / "rules"
    (folder / "deeper").mkdir(parents=True)
    (folder / "one.rule").write_text(RULE.format(figure=9), encoding="utf-8")
    (folder / "deeper" / "two.rule").write_text("rule two\n  title   Another\n", encoding="utf-8")
    (folder / "notes.txt").write_text("no rule", encoding="utf-8")
    return folder


def test_rules_of_a_folder_come_in_the_order_of_names_with_their_file(book: Path, cache: Path) -> None:
    rules = load_rules(book)
    assert [(rule.id, rule.place.file if rule.place else "") for rule in rules] == [
        ("two", "deeper/two.rule"),
        ("one", "one.rule"),
    ]


def test_a_second_load_comes_from_the_cache_and_is_equal(book: Path, cache: Path) -> None:
    first = load_rules(book)
    (kept,) = cache.glob("rules-*.msgpack")
    before = kept.stat().st_mtime_ns
    assert load_rules(book) == first
    assert kept.stat().st_mtime_ns == before


def test_pyparsing_is_imported_only_when_nothing_is_cached(book: Path, cache: Path) -> None:
    seen = []
    for _ in range(2):
        done = subprocess.run(
            [sys.executable, "-c", _PROGRAM, str(book)],
            capture_output=True,
            text=True,
            check=True,
            env=dict(os.environ),
        )
        seen.append(done.stdout.split())
    assert seen == [["2", "True"], ["2", "False"]]


def test_a_changed_file_is_read_again(book: Path, cache: Path) -> None:
    first = load_rules(book)
    (book / "one.rule").write_text(RULE.format(figure=8), encoding="utf-8")
    second = load_rules(book)
    assert (first[1].needs[0].high, second[1].needs[0].high) == (9.0, 8.0)  # type: ignore[union-attr]


def test_a_spoilt_cache_is_passed_over(book: Path, cache: Path) -> None:
    first = load_rules(book)
    (kept,) = cache.glob("rules-*.msgpack")
    content = bytearray(kept.read_bytes())
    content[-1] ^= 0xFF
    kept.write_bytes(bytes(content))
    assert load_rules(book) == first


def test_a_cache_that_cannot_be_written_does_no_harm(
    book: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    in_the_way = tmp_path / "file"
    in_the_way.write_text("", encoding="utf-8")
    monkeypatch.setenv("CARBOY_CACHE", str(in_the_way / "cache"))
    assert [rule.id for rule in load_rules(book)] == ["two", "one"]


def test_a_cache_key_keeps_books_apart(book: Path, cache: Path) -> None:
    load_rules(book)
    load_rules(book, cache_key="other")
    assert len(list(cache.glob("rules-*.msgpack"))) == 2


def test_one_file_may_be_given(book: Path, cache: Path) -> None:
    (rule,) = load_rules(book / "one.rule")
    assert rule.id == "one"


def test_where_there_are_no_rules_it_says_so(tmp_path: Path) -> None:
    with pytest.raises(RuleError, match=r"holds no \.rule file"):
        read_rule_sources(tmp_path)
    with pytest.raises(RuleError, match="there is no rule file or folder"):
        read_rule_sources(tmp_path / "none")


def test_the_shipped_rules_are_all_there(cache: Path) -> None:
    rules = load_rules()
    assert {rule.place.file for rule in rules if rule.place} == set(read_rule_sources())
    assert load_rules() == rules
