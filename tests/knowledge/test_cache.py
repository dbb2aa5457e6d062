"""The compiled index and its cache: whole or rebuilt, never in the way."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from pathlib import Path

import pytest
from rdflib import URIRef

from carboy import cache as cache_module
from carboy.errors import CarboyError, KnowledgeError
from carboy.knowledge import index as index_module
from carboy.knowledge.files import digest, read_files
from carboy.knowledge.index import graph, is_compiled, load_index
from carboy.knowledge.problems import KnowledgeProblems


def cached(cache: Path) -> list[Path]:
    return sorted(cache.glob("index-*"))


def test_second_load_reads_the_cache(small_kb: Path, cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    first = load_index(small_kb)
    assert len(cached(cache)) == 1
    monkeypatch.setattr(index_module, "_compile", lambda files: pytest.fail("compiled again"))
    assert load_index(small_kb) == first


def test_a_changed_file_is_compiled_again(small_kb: Path, cache: Path) -> None:
    before = load_index(small_kb)
    file = small_kb / "base.ttl"
    stamp = file.stat()
    text = file.read_text(encoding="utf-8")
    file.write_text(text.replace(":magnitude 7.0 ", ":magnitude 7.1 "), encoding="utf-8")
    os.utime(file, ns=(stamp.st_atime_ns, stamp.st_mtime_ns))  # same size, same time: only the content tells
    after = load_index(small_kb)
    assert before.equilibria != after.equilibria
    assert len(cached(cache)) == 2


def test_names_of_files_count(small_kb: Path) -> None:
    files = read_files(small_kb)
    renamed = {("other.ttl" if name == "base.ttl" else name): content for name, content in files.items()}
    assert digest(files) != digest(renamed)
    assert digest(files) == digest(dict(files))


@pytest.mark.parametrize("damage", ["truncate", "flip", "empty", "garbage"])
def test_a_corrupt_cache_is_rebuilt(small_kb: Path, cache: Path, damage: str) -> None:
    sound = load_index(small_kb)
    (file,) = cached(cache)
    content = file.read_bytes()
    middle = len(content) // 2
    file.write_bytes(
        {
            "truncate": content[:middle],
            "flip": content[:middle] + bytes([content[middle] ^ 1]) + content[middle + 1 :],
            "empty": b"",
            "garbage": b"\x80\x04\x95 pickle or anything else",
        }[damage]
    )
    assert load_index(small_kb) == sound
    assert file.read_bytes() == content


def test_a_folder_that_cannot_be_made_is_passed_over(
    small_kb: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("in the way", encoding="utf-8")
    monkeypatch.setenv("CARBOY_CACHE", str(blocked / "cache"))
    assert load_index(small_kb).species
    assert blocked.read_text(encoding="utf-8") == "in the way"


def test_a_folder_that_cannot_be_written_is_passed_over(
    small_kb: Path, cache: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*args: object, **options: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(cache_module.os, "replace", refuse)
    assert load_index(small_kb).species
    assert cached(cache) == []  # no half-written file stays behind


def test_few_old_indexes_are_kept(small_kb: Path, cache: Path) -> None:
    for number in range(6):
        (small_kb / f"note-{number}.ttl").write_text(f"# {number}\n", encoding="utf-8")
        load_index(small_kb)
    assert len(cached(cache)) == 4


def test_broken_knowledge_raises_and_is_not_cached(small_kb: Path, cache: Path) -> None:
    (small_kb / "bad.ttl").write_text(
        "@prefix : <urn:carboy:term:> .\n@prefix sub: <urn:carboy:substance:> .\n"
        "sub:a a :Substance .\nsub:b a :Thing .\n",
        encoding="utf-8",
    )
    with pytest.raises(KnowledgeProblems) as caught:
        load_index(small_kb)
    assert isinstance(caught.value, CarboyError)
    assert {problem.node for problem in caught.value.problems} == {"sub:a", "sub:b"}
    assert "bad.ttl:3: sub:a: lacks" in str(caught.value)
    assert cached(cache) == []


def test_a_folder_without_vocabulary_is_no_knowledge_folder(tmp_path: Path) -> None:
    with pytest.raises(KnowledgeError, match="no knowledge folder"):
        load_index(tmp_path)


def test_warm_load_imports_no_rdf_library(small_kb: Path, cache: Path) -> None:
    load_index(small_kb)
    code = (
        "import sys\nfrom pathlib import Path\nfrom carboy.knowledge.index import load_index\n"
        f"load_index(Path({str(small_kb)!r}))\nassert 'rdflib' not in sys.modules, 'rdflib was imported'\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], check=False, capture_output=True, text=True, env=dict(os.environ)
    )
    assert done.returncode == 0, done.stderr


def test_hash_of_the_shipped_files_is_quick() -> None:
    best = 1.0
    for _ in range(5):
        start = time.perf_counter()
        digest(read_files())
        best = min(best, time.perf_counter() - start)
    assert best < 0.05  # 10 ms on an idle machine; this one may be busy


def test_graph_answers_queries(small_kb: Path) -> None:
    rows = list(
        graph(small_kb).query(
            """
            PREFIX : <urn:carboy:term:>
            SELECT ?substance WHERE {
                ?substance a :Substance ;
                           :cas "1313-84-4" .
            }
            """
        )
    )
    assert [row[0] for row in rows] == [URIRef("urn:carboy:substance:sodium-sulfide-nonahydrate")]


def test_it_can_be_asked_whether_the_index_is_compiled(small_kb: Path, cache: Path) -> None:
    assert not is_compiled(small_kb)
    load_index(small_kb)
    assert is_compiled(small_kb)
    (small_kb / "note.ttl").write_text("# changed\n", encoding="utf-8")
    assert not is_compiled(small_kb)
