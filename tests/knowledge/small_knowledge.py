"""The small sound knowledge of tests/broken/kb, alone or with further files."""

from __future__ import annotations

from pathlib import Path

from carboy.datafiles import data_dir

BROKEN = Path(__file__).resolve().parent.parent / "broken" / "kb"


def small_files(*more: Path) -> dict[str, bytes]:
    """The vocabulary, the shapes, the elements, the sound base and ``more``."""
    kb = data_dir("kb")
    files = {name: (kb / name).read_bytes() for name in ("elements.ttl", "schema.ttl", "shapes.ttl")}
    files["base.ttl"] = (BROKEN / "base.ttl").read_bytes()
    return files | {file.name: file.read_bytes() for file in more}
