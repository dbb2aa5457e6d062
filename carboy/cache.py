"""Compiled data between runs: MessagePack of plain records (nothing of it can run), led by a checksum of itself.

The folder may be deleted at any time; what cannot be read or written is passed over.
"""

from __future__ import annotations

import gc
import os
import tempfile
import zlib
from pathlib import Path
from typing import TypeVar

import msgspec

Record = TypeVar("Record")

_CHECK_SIZE = 4  # bytes of the leading checksum, CRC-32: it guards against half-written files, not against people
_KEPT = 4  # files of one sort kept in the folder


def cache_folder() -> Path:
    """Where compiled data is kept: ``CARBOY_CACHE`` if set, else the user's cache folder."""
    chosen = os.environ.get("CARBOY_CACHE")
    if chosen:
        return Path(chosen)
    from platformdirs import user_cache_dir  # costs some milliseconds

    return Path(user_cache_dir("carboy", appauthor=False))


def is_cached(sort: str, digest: str) -> bool:
    """Whether something is kept under that name; it may still turn out not to be whole."""
    return (cache_folder() / f"{sort}-{digest}.msgpack").is_file()


def read_cached(sort: str, digest: str, record: type[Record]) -> Record | None:
    """The record kept as ``sort`` (``index``, ``rules``) under ``digest``, or None if there is none that is whole."""
    try:
        content = (cache_folder() / f"{sort}-{digest}.msgpack").read_bytes()
    except OSError:
        return None
    check, body = content[:_CHECK_SIZE], content[_CHECK_SIZE:]
    if zlib.crc32(body).to_bytes(_CHECK_SIZE, "big") != check:
        return None
    collecting = gc.isenabled()
    gc.disable()  # ten thousand fresh records, none of them garbage
    try:
        return msgspec.msgpack.decode(body, type=record)
    except msgspec.MsgspecError:
        return None
    finally:
        if collecting:
            gc.enable()


def write_cached(sort: str, digest: str, record: object) -> None:
    """Keep ``record``: written to a temporary file and put in place in one step.

    A folder that cannot be written is passed over.
    """
    body = msgspec.msgpack.encode(record)
    folder = cache_folder()
    temporary = ""
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.NamedTemporaryFile(dir=folder, prefix=f"{sort}-", suffix=".part", delete=False) as file:
            temporary = file.name
            file.write(zlib.crc32(body).to_bytes(_CHECK_SIZE, "big") + body)
        os.replace(temporary, folder / f"{sort}-{digest}.msgpack")
        temporary = ""
        old = sorted(folder.glob(f"{sort}-*.msgpack"), key=lambda item: item.stat().st_mtime, reverse=True)
        for item in old[_KEPT:]:
            item.unlink(missing_ok=True)
    except OSError:
        pass
    finally:
        if temporary:
            Path(temporary).unlink(missing_ok=True)
