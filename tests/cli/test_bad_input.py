"""Whatever is typed, the answer is a sentence and exit status 2, never a traceback."""

from __future__ import annotations

import pytest

WATER = "10 mL of water"

PORTIONS = [
    "",
    " ",
    "water",
    "of water",
    "10",
    "10 mL",
    "10 mL of",
    "mL of water",
    "-5 mL of water",
    "0 mL of water",
    "1e999 L of water",
    "nan L of water",
    "10 parsecs of water",
    "100 mm of acetone",
    "10 mL of 120 % acetone",
    "10 mL of 2 Q acetone",
    "50-10 mL of water",
    "10 mL of (0.1 M NaCl + ",
    "10 mL of (0.1 M NaCl))",
    "10 mL of 1 M",
    "1 L of unknown, pH 99",
    "1 L of water, pH",
    "20 g of CAS 1313-82-3",
    "20 g of CAS 99",
    "10 mL of \x00",
    "\N{PILE OF POO}",
    "10 mL of " + "x" * 20000,
    "(((((((((((",
    "10 mL of 2 M NaOH in",
]
OPTIONS = [
    ("--volume", "two"),
    ("--volume", "-2 L"),
    ("--volume", "0 L"),
    ("--volume", "2 kg"),
    ("--volume", "1e300 L"),
    ("--cover", "ajar"),
    ("--material", "unobtainium"),
    ("--temperature", "warm"),
    ("--temperature", "22"),
    ("--temperature", "-500 degC"),
    ("--place", "moon"),
    ("--hood-flow", "0 m3/s"),
    ("--hood-flow", "fast"),
    ("--room-volume", "60 kg"),
    ("--air-changes", "many"),
    ("--nonsense", "1"),
]
OTHERS = [
    ("combine",),
    ("combine", WATER),
    ("nonsense",),
    ("vet",),
    ("vet", "no-such-file.yaml"),
    ("vet", "."),
    ("vet", "\x00"),
    ("look",),
    ("look", ""),
    ("look", "flurbium"),
    ("look", "1313-82-3"),
    ("ask",),
    ("ask", ""),
    ("ask", "?r"),
    ("ask", "acid needs"),
    ("ask", "?r gives flurbium"),
    ("ask", "?r flags toxicgas"),
    ("ask", "?r needs ?X"),
    ("ask", "sulfide is sulfide"),
    ("ask", "?r cites nobody-2001"),
    ("ask", "?r is acid but not ?x"),
    ("rule", "no-such-rule"),
    ("kb", "check", "--kb", "no-such-folder"),
    ("kb", "nonsense"),
    ("kb", "check", "--rules", "no-such-folder", "--quick"),
    ("kb", "check", "--rule", "no-such-rule"),
]
CASE_FILES = [
    b"",
    b"\xff\xfe\x00",
    b"steps: []\n",
    b"steps: 3\n",
    b"title: [\n",
    b"- 1\n- 2\n",
    b"steps:\n  - add: 10 mL of water\n    over: yesterday\n",
    b"steps:\n  - add: 10 mL of water\n  - filter: nowhere\n",
    b"bottles: {a: 1 L of water}\nsteps:\n  - add: 2 L from a\n",
    b"steps:\n  - add: 10 mL of water\n    add: 10 mL of water\n",
    b"setting: {place: moon}\nsteps:\n  - add: 10 mL of water\n",
    b"steps:\n  - add: 10 mL of water\nexpect:\n  - {step: 9, kind: heat}\n",
    b"steps:\n  - add: 10 mL of water\ngoals:\n  - make it nice\n",
    b"a: &a [*a]\n",
    b"steps: !!python/object/apply:os.system [ls]\n",
    b"[" * 5000,
]


def refused(ran) -> None:
    assert ran.status == 2
    assert "Traceback" not in ran.err
    assert "fault of the program" not in ran.err
    assert ran.err.strip()
    first = ran.err.splitlines()[0]
    assert first.startswith(("carboy: ", "Usage: ", "Error: "))


@pytest.mark.parametrize("portion", PORTIONS, ids=lambda text: repr(text[:24]))
def test_portions(carboy, portion):
    refused(carboy("combine", portion, WATER))
    refused(carboy("combine", WATER, portion))


@pytest.mark.parametrize("option", OPTIONS, ids=" ".join)
def test_options(carboy, option):
    refused(carboy("combine", WATER, WATER, *option))


@pytest.mark.parametrize("arguments", OTHERS, ids=repr)
def test_commands(carboy, arguments):
    refused(carboy(*arguments))


@pytest.mark.parametrize("content", CASE_FILES, ids=lambda content: repr(content[:32]))
def test_case_files(carboy, tmp_path, content):
    file = tmp_path / "case.yaml"
    file.write_bytes(content)
    ran = carboy("vet", str(file))
    refused(ran)
    assert "case.yaml" in ran.err
