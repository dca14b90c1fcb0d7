"""The wheel carries all that the demo needs, firmware included, outside any checkout."""

from __future__ import annotations

import os
import subprocess
import sys
import venv
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    build = [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", str(folder), str(ROOT)]
    done = subprocess.run(build, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr
    (built,) = folder.glob("*.whl")
    return built


def test_the_wheel_carries_the_firmware_byte_for_byte_and_no_compiled_files(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = archive.namelist()
        carried = {
            name.removeprefix("sinkwright/_firmware/"): archive.read(name)
            for name in names
            if name.startswith("sinkwright/_firmware/")
        }
    firmware = ROOT / "firmware"
    shipped = {str(path.relative_to(firmware)): path.read_bytes() for path in firmware.rglob("*.py")}
    assert carried == shipped
    assert not [name for name in names if "__pycache__" in name or name.endswith(".pyc")]


@pytest.mark.timeout(600)
def test_the_demo_runs_from_an_empty_environment_outside_the_checkout(wheel: Path, tmp_path: Path) -> None:
    environment = tmp_path / "environment"
    venv.create(environment, with_pip=True)
    scripts = environment / ("Scripts" if os.name == "nt" else "bin")
    install = [str(scripts / "python"), "-m", "pip", "install", "--quiet", f"{wheel}[report]"]
    installed = subprocess.run(install, capture_output=True, text=True, check=False, cwd=tmp_path)
    assert installed.returncode == 0, installed.stderr
    clean = {key: value for key, value in os.environ.items() if key not in ("PYTHONPATH", "VIRTUAL_ENV")}
    clean["HOME"] = str(tmp_path)
    demo = subprocess.run(
        [str(scripts / "sinkwright"), "demo"],
        capture_output=True,
        text=True,
        check=False,
        cwd=tmp_path,
        env=clean,
    )
    assert demo.returncode == 0, demo.stdout + demo.stderr
    assert "SIMULATED" in demo.stdout
    assert list(tmp_path.rglob("*.sqlite"))
    assert list(tmp_path.rglob("*.html"))
