"""What ``vet`` and ``combine`` share for --mend: the text of what was found, and the file that --apply writes."""

from __future__ import annotations

import json as json_text
import os
from collections.abc import Sequence
from pathlib import Path

from carboy.errors import InputError
from carboy.model.report import Report
from carboy.planning.repair import Mending
from carboy.reports.mendings import mending_data, mendings_text
from carboy.reports.style import style_for

OFFER = "--apply N writes one of them as a case file."


def with_mendings(printed: str, report: Report, mendings: Sequence[Mending], *, json: bool, plain: bool) -> str:
    """A printed report followed by what mends it; with ``json`` one object with both."""
    if json:
        whole = {"report": json_text.loads(printed), "mendings": [mending_data(one) for one in mendings]}
        return json_text.dumps(whole, indent=2, ensure_ascii=False)
    sound = report.verdict in ("no objection", "cannot say")
    return printed.rstrip("\n") + "\n\n" + mendings_text(mendings, style_for(plain=plain), sound=sound, offer=OFFER)


def chosen(mendings: Sequence[Mending], number: int) -> Mending:
    """The mending of a number as listed. Raises InputError."""
    if not mendings:
        raise InputError("there is no change to apply: none was found that clears it")
    if not 1 <= number <= len(mendings):
        raise InputError(f"--apply {number}: the changes found are numbered 1 to {len(mendings)}")
    return mendings[number - 1]


def write_mended(mending: Mending, given: Path | None, output: Path | None) -> str:
    """Write the mended case to ``output``, which must not exist, or over ``given``, whose old text stays beside it as FILE.bak; the words
    that say so. Raises InputError where it cannot be written."""
    target = output if output is not None else given
    if target is None:
        raise InputError("--apply needs --output, the name of the case file to write")
    try:
        if output is not None:
            with output.open("x", encoding="utf-8") as file:
                file.write(mending.text())
            return f"Written to {output}."
        kept = _backup_name(target)
        fresh = target.with_name(target.name + ".new")
        fresh.write_text(mending.text(), encoding="utf-8")
        os.link(target, kept)  # fails rather than write over an older backup
        os.replace(fresh, target)
    except FileExistsError:
        raise InputError(f"'{target}' exists already; name another file") from None
    except OSError as error:
        raise InputError(f"'{target}' cannot be written: {error.strerror or error}") from None
    return f"Written to {target}; the old text is in {kept}."


def _backup_name(file: Path) -> Path:
    """FILE.bak, or FILE.bak2 and so on where that is kept from an earlier change."""
    number, kept = 1, file.with_name(file.name + ".bak")
    while kept.exists():
        number += 1
        kept = file.with_name(f"{file.name}.bak{number}")
    return kept
