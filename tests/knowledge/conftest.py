"""Fixtures: a folder with the small sound knowledge, an empty cache."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.knowledge.small_knowledge import small_files


@pytest.fixture
def small_kb(tmp_path: Path) -> Path:
    """A folder with the small sound knowledge."""
    folder = tmp_path / "kb"
    folder.mkdir()
    for name, content in small_files().items():
        (folder / name).write_bytes(content)
    return folder


@pytest.fixture
def cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A cache folder, not yet made, that carboy is told to use."""
    folder = tmp_path / "cache"
    monkeypatch.setenv("CARBOY_CACHE", str(folder))
    return folder
