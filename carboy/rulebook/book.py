"""The rules, compiled once: loaded from the cache if the files are unchanged, else read with the grammar.

pyparsing is imported only when a file has changed.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from pathlib import Path

import carboy
from carboy.cache import read_cached, write_cached
from carboy.datafiles import data_dir
from carboy.errors import RuleError
from carboy.model.rule import Rule

# Code that decides what the compiled rules hold; a change there must not meet rules compiled before it.
_PACKAGE = Path(__file__).resolve().parent.parent
_COMPILING_CODE = ("text/rule_grammar.py", "text/rule_reader.py", "model/rule.py")


def read_rule_sources(path: Path | None = None) -> dict[str, bytes]:
    """Name to show -> content of one rule file, or of every ``.rule`` file below a folder, in the order of names.

    ``path`` None is the shipped rules/. Raises RuleError where there is none or one cannot be read, DataFilesMissing.
    """
    start = path if path is not None else data_dir("rules")
    if start.is_file():
        files = [start]
        base = start.parent
    elif start.is_dir():
        files = sorted(file for file in start.rglob("*.rule") if file.is_file())
        base = start
    else:
        raise RuleError(f"there is no rule file or folder '{start}'")
    if not files:
        raise RuleError(f"the folder '{start}' holds no .rule file")
    try:
        return {file.relative_to(base).as_posix(): file.read_bytes() for file in files}
    except OSError as error:
        raise RuleError(f"a rule file cannot be read: {error.strerror}") from error


def load_rules(path: Path | None = None, *, cache_key: str = "") -> tuple[Rule, ...]:
    """The rules of ``path`` (None: the shipped rules/) in the order of files, switched-off ones among them.

    ``cache_key`` goes into the name under which they are kept, for whoever must not share it. Raises RuleError.
    """
    sources = read_rule_sources(path)
    digest = _digest(sources, cache_key)
    rules = read_cached("rules", digest, tuple[Rule, ...])
    if rules is None:
        from carboy.text.rule_reader import read_rule_files  # brings pyparsing and rapidfuzz, 0.1 s

        rules = read_rule_files(sources.items())
        write_cached("rules", digest, rules)
    return rules


def _digest(sources: Mapping[str, bytes], cache_key: str) -> str:
    """BLAKE2b of names and contents, of the carboy version and of the compiling code."""
    state = hashlib.blake2b(f"{carboy.__version__}\0{cache_key}".encode(), digest_size=20)
    for name in _COMPILING_CODE:
        state.update((_PACKAGE / name).read_bytes())
    for name, content in sources.items():
        # lengths first, so that no two different sets of files run together to the same bytes
        state.update(f"\0{name}\0{len(content)}\0".encode())
        state.update(content)
    return state.hexdigest()
