"""The wheel carries all that the program needs: it runs where no source tree is."""

import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


@pytest.mark.slow
def test_a_wheel_installed_elsewhere_plays_the_demo(tmp_path: Path) -> None:
    wheels, place, away = tmp_path / "wheels", tmp_path / "venv", tmp_path / "elsewhere"
    away.mkdir()
    run = [sys.executable, "-m", "pip", "wheel", "-q", "--no-deps", "-w", str(wheels), str(ROOT)]
    subprocess.run(run, check=True)
    [wheel] = wheels.glob("coilwright-*.whl")
    names = zipfile.ZipFile(wheel).namelist()
    for wanted in (
        "migrations/env.py",
        "migrations/script.py.mako",
        "migrations/versions/m0001_first_schema.py",
        "service/py.typed",
        "service/pages/templates/",
        "service/pages/static/",
        "seed_demo/recipes/long-single.json",
    ):
        assert any(name.startswith(wanted) for name in names), wanted
    assert not any(name.startswith("tests/") for name in names)

    subprocess.run([sys.executable, "-m", "venv", str(place)], check=True)
    python = str(place / "bin" / "python")
    subprocess.run([python, "-m", "pip", "install", "-q", str(wheel)], check=True)
    environment = {
        k: v for k, v in os.environ.items() if not k.startswith(("PYTHON", "COILWRIGHT"))
    }
    played = subprocess.run(
        [str(place / "bin" / "coilwright"), "demo", "--no-serve"],
        cwd=away,
        env=environment,
        check=True,
        capture_output=True,
        text=True,
    )
    assert "invented" in played.stdout
    assert "conforms" in played.stdout
    again = subprocess.run(
        [str(place / "bin" / "coilwright"), "demo", "--no-serve"],
        cwd=away,
        env=environment,
        check=True,
        capture_output=True,
        text=True,
    )
    assert "there already" in again.stdout
