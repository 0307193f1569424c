"""Re-make the worked reports: ``.venv/bin/python tests/remake_reports.py``.

For every folder of ``reports/`` with a ``study.toml``: run it and keep ``report.html`` and ``summary.json`` beside the
study. A test runs the studies again and compares the numbers.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
REPORTS = ROOT / "reports"
KEPT = ("report.html", "summary.json")


def studies() -> list[Path]:
    return sorted(REPORTS.glob("*/study.toml"))


def main() -> None:
    from benchmark.record.load import load_study
    from benchmark.record.run import run_study
    from benchmark.report.folder import fill_folder

    for path in studies():
        study, library = load_study(path)
        record = run_study(study, library, created=f"{study.declared}T00:00:00Z")
        record["what_if"] = {}
        with tempfile.TemporaryDirectory() as folder:
            fill_folder(Path(folder), record)
            for name in KEPT:
                shutil.copyfile(Path(folder) / name, path.parent / name)
        sys.stdout.write(f"{path.parent.name}: {record['verdict']['word']}\n")


if __name__ == "__main__":
    main()
