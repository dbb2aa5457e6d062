"""Where kb/ and rules/ are: inside an installed wheel (``carboy/_data``) or beside the package in a checkout."""

from __future__ import annotations

from pathlib import Path

from carboy.errors import DataFilesMissing

_MARKERS = {"kb": "schema.ttl", "rules": "README.md", "cases": "README.md"}


def data_dir(name: str) -> Path:
    """The folder ``name`` (``kb``, ``rules`` or ``cases``).

    A folder is taken only if its marker file is inside, so that a stranger's folder of the same name is never adopted.
    Raises DataFilesMissing.
    """
    package = Path(__file__).resolve().parent
    for candidate in (package / "_data" / name, package.parent / name):
        if (candidate / _MARKERS[name]).is_file():
            return candidate
    raise DataFilesMissing(f"the data folder '{name}' was not found beside the package; install carboy again")
