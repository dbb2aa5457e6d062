"""The wheel holds all it needs: built, installed into an empty environment, run from an empty folder."""

from __future__ import annotations

import fnmatch
import json
import os
import subprocess
import sys
import sysconfig
import zipfile
from pathlib import Path

import pytest

import carboy

ROOT = Path(__file__).resolve().parent.parent
DATA = ("kb", "rules", "cases")
LEFT_OUT = ("*~", "*.bak", "*.tmp", "*.pyc", "__pycache__", ".*")


@pytest.fixture(scope="session")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel of this checkout, built with the hatchling of the test extra: isolation would fetch one from the network."""
    folder = tmp_path_factory.mktemp("wheel")
    command = [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", str(folder), str(ROOT)]
    ran = subprocess.run(command, capture_output=True, text=True, check=False)
    assert ran.returncode == 0, ran.stdout + ran.stderr
    (built,) = folder.glob("*.whl")
    return built


@pytest.fixture(scope="session")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """An environment with the wheel alone; what it depends on is lent from this one by a path file, so no network is needed."""
    place = tmp_path_factory.mktemp("environment")
    subprocess.run([sys.executable, "-m", "venv", "--without-pip", str(place)], check=True)
    binaries = place / ("Scripts" if os.name == "nt" else "bin")
    python = binaries / ("python.exe" if os.name == "nt" else "python")
    command = [
        sys.executable,
        "-m",
        "pip",
        "--python",
        str(python),
        "install",
        "--quiet",
        "--no-deps",
        "--no-index",
        str(wheel),
    ]
    ran = subprocess.run(command, capture_output=True, text=True, check=False)
    assert ran.returncode == 0, ran.stdout + ran.stderr
    code = "import sysconfig; print(sysconfig.get_path('purelib'))"
    own = subprocess.run([str(python), "-c", code], capture_output=True, text=True, check=True).stdout.strip()
    lent = dict.fromkeys(sysconfig.get_path(name) for name in ("purelib", "platlib"))
    (Path(own) / "lent.pth").write_text("\n".join(lent), encoding="utf-8")
    return binaries


@pytest.fixture
def elsewhere(tmp_path: Path) -> dict[str, object]:
    """An empty folder, and an environment without a way back to the checkout."""
    kept = {key: value for key, value in os.environ.items() if key not in ("PYTHONPATH", "VIRTUAL_ENV")}
    return {"cwd": tmp_path, "env": {**kept, "CARBOY_CACHE": str(tmp_path / "cache")}}


def shipped(folder: str) -> set[str]:
    """The files of a data folder of the tree that belong into the wheel."""
    base = ROOT / folder
    return {
        file.relative_to(base).as_posix()
        for file in base.rglob("*")
        if file.is_file()
        and not any(fnmatch.fnmatch(part, pattern) for part in file.relative_to(base).parts for pattern in LEFT_OUT)
    }


@pytest.mark.parametrize("folder", DATA)
def test_data_files_of_the_wheel_are_those_of_the_tree(wheel, folder):
    prefix = f"carboy/_data/{folder}/"
    with zipfile.ZipFile(wheel) as archive:
        inside = {name.removeprefix(prefix) for name in archive.namelist() if name.startswith(prefix)}
    assert inside == shipped(folder)
    assert len(inside) >= 2


def test_modules_of_the_wheel_are_those_of_the_tree(wheel):
    with zipfile.ZipFile(wheel) as archive:
        inside = {name for name in archive.namelist() if name.endswith(".py")}
    assert inside == {file.relative_to(ROOT).as_posix() for file in (ROOT / "carboy").rglob("*.py")}


def test_no_python_file_among_the_data():
    """One such file would make the editable install fail while the wheel still builds."""
    assert not [file for folder in DATA for file in (ROOT / folder).rglob("*.py")]


def test_installed_wheel_does_the_main_job_from_an_empty_folder(installed, elsewhere):
    where = subprocess.run(
        [str(installed / "python"), "-c", "import carboy; print(carboy.__file__)"],
        capture_output=True,
        text=True,
        check=True,
        **elsewhere,
    )
    assert Path(where.stdout.strip()).is_relative_to(installed.parent)
    command = [
        str(installed / "carboy"),
        "combine",
        "1 L of 0.1 M sodium sulfide",
        "1 L of 0.5 M hydrochloric acid",
        "--json",
    ]
    ran = subprocess.run(command, capture_output=True, text=True, check=False, **elsewhere)
    assert ran.stderr == ""
    assert ran.returncode == 1
    report = json.loads(ran.stdout)
    assert report["format"] == "carboy-report/1"
    assert report["verdict"] == "refuse"
    gas = next(f for f in report["findings"] if f["kind"] == "toxic-gas" and f["species"] == ["H2S"])
    assert gas["amount_mol"] == pytest.approx([0.1, 0.1], rel=0.01)  # all the sulfide there is


def test_installed_wheel_says_its_version(installed, elsewhere):
    ran = subprocess.run(
        [str(installed / "carboy"), "--version"], capture_output=True, text=True, check=True, **elsewhere
    )
    assert ran.stdout == f"carboy {carboy.__version__}\n"


def test_module_runs_as_the_command(installed, elsewhere):
    ran = subprocess.run(
        [str(installed / "python"), "-m", "carboy", "combine", "water"],
        capture_output=True,
        text=True,
        check=False,
        **elsewhere,
    )
    assert ran.returncode == 2
    assert ran.stderr.startswith("carboy: ")
