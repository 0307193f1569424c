"""The test command: ``python3 tests/run.py``. Sets up everything it needs, then runs every check.

Standard library only, so that a bare Python 3.11 can start it. System packages (ngspice, chromium) are installed where
that is allowed (Debian family, as root); otherwise the command stops and names them. Nothing is skipped.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import venv
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
ENVIRONMENT = ROOT / ".venv"
BIN = ENVIRONMENT / ("Scripts" if os.name == "nt" else "bin")
#: program -> Debian package
PROGRAMS = {"ngspice": "ngspice", "chromium": "chromium", "cc": "gcc"}

#: open 45 nm transistor cards (text files, Apache-2.0)
CARDS = "c4m-pdk-freepdk45==0.0.1"


def say(text: str) -> None:
    print(f"== {text}", flush=True)


def system_packages() -> None:
    """Install missing programs, or stop and name them."""
    missing = {program: package for program, package in PROGRAMS.items() if shutil.which(program) is None}
    if not missing:
        return
    packages = sorted(missing.values())
    if shutil.which("apt-get") and hasattr(os, "geteuid") and os.geteuid() == 0:
        say(f"installing system packages: {' '.join(packages)}")
        environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
        subprocess.run(["apt-get", "update", "-qq"], check=True, env=environment)
        subprocess.run(
            ["apt-get", "install", "-y", "-qq", "--no-install-recommends", *packages],
            check=True,
            env=environment,
            stdout=subprocess.DEVNULL,
        )
    still = sorted(program for program in missing if shutil.which(program) is None)
    if still:
        sys.exit(
            f"missing programs: {', '.join(still)}; install them (Debian packages: {' '.join(packages)}) and run again"
        )


def python_packages() -> None:
    """Create the environment and install the package with its test tools."""
    if not (BIN / "python").exists():
        say("creating .venv")
        venv.create(ENVIRONMENT, with_pip=True)
    say("installing evenload and its test tools into .venv")
    subprocess.run(
        [BIN / "python", "-m", "pip", "install", "--quiet", "--disable-pip-version-check", "-e", f"{ROOT}[test]"],
        check=True,
    )
    # a file of transistor cards is read from it; what its own code would need is not
    subprocess.run(
        [BIN / "python", "-m", "pip", "install", "--quiet", "--disable-pip-version-check", "--no-deps", CARDS],
        check=True,
    )


def main() -> None:
    """Set up and run every check; the first failure stops with its own status."""
    system_packages()
    python_packages()
    environment = {**os.environ, "OMP_NUM_THREADS": "1", "PYTHONPATH": ""}
    steps: list[tuple[str, list[str]]] = [
        ("ruff check", ["ruff", "check", "."]),
        ("ruff format", ["ruff", "format", "--check", "."]),
        ("mypy strict", ["mypy"]),
        ("import contracts", ["lint-imports", "--no-cache"]),
        ("pytest", ["pytest", "-n", "2", *sys.argv[1:]]),
    ]
    for name, command in steps:
        say(name)
        done = subprocess.run([BIN / command[0], *command[1:]], cwd=ROOT, env=environment, check=False)
        if done.returncode != 0:
            sys.exit(done.returncode)
    say("all checks passed")


if __name__ == "__main__":
    main()
