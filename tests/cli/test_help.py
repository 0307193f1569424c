"""Help answers at once, because nothing heavy is imported for it."""

from __future__ import annotations

import ast
import inspect
import json
import subprocess
import sys
from pathlib import Path

import pytest

import benchmark
import benchmark.cli.app as app_module
import benchmark.cli.set_commands as set_module
from tests.cli.conftest import Run

#: pydantic is not listed: the command-line library itself imports it (about 50 ms)
HEAVY = ("numpy", "scipy", "pandas", "pint", "altair", "vl_convert", "jinja2", "rich", "tomllib")
MODULES = (app_module, set_module)
COMMANDS = (
    "run",
    "demo",
    "check",
    "show",
    "new",
    "trace",
    "export",
    "need",
    "changes",
    "batch",
    "supersede",
    "sheet",
    "extract",
)
PROBE = """
import json, sys
sys.argv = ["evenload", *json.loads(sys.argv[1])]
from benchmark.cli import main
try:
    main()
except SystemExit as stopped:
    print(json.dumps([stopped.code or 0, [name for name in json.loads('HEAVY') if name in sys.modules]]))
"""


def _probe(arguments: list[str]) -> tuple[str, int, list[str]]:
    """Run in a fresh interpreter: what was printed, the exit status, heavy modules that were imported."""
    code = PROBE.replace("HEAVY", json.dumps(HEAVY))
    done = subprocess.run(
        [sys.executable, "-c", code, json.dumps(arguments)], capture_output=True, text=True, check=True, timeout=60
    )
    *text, last = done.stdout.splitlines()
    status, heavy = json.loads(last)
    return "\n".join(text), status, heavy


@pytest.mark.parametrize("arguments", [["--help"], ["--version"], *([command, "--help"] for command in COMMANDS)])
def test_help_imports_nothing_heavy(arguments: list[str]):
    text, status, heavy = _probe(arguments)
    assert text
    assert status == 0
    assert heavy == []


def test_without_a_command_the_help_goes_to_standard_error(evenload: Run):
    ran = evenload()
    assert (ran.status, ran.out) == (2, "")
    assert "Commands:" in ran.err


def test_the_probe_sees_heavy_modules():
    _, status, heavy = _probe(["show", "classes"])
    assert status == 0
    assert "numpy" in heavy


def test_help_names_every_command(evenload: Run):
    ran = evenload("--help")
    assert ran.status == 0
    listed = {line.split()[0] for line in ran.out.splitlines() if line.startswith("  ") and line.strip()}
    assert set(COMMANDS) <= listed


def test_version(evenload: Run):
    assert evenload("--version").out == f"{benchmark.__version__}\n"


@pytest.mark.parametrize("arguments", [["rum"], ["run"], ["check", "--nods", "x"], ["trace", "x", "--supply", "low"]])
def test_wrong_usage_is_status_2(arguments: list[str], evenload: Run):
    ran = evenload(*arguments)
    assert ran.status == 2
    assert ran.out == ""
    assert ran.err


def test_every_option_of_a_command_is_used():
    """An option that is taken and then forgotten would be accepted without any effect."""
    trees = [ast.parse(Path(inspect.getsourcefile(module) or "").read_text(encoding="utf-8")) for module in MODULES]
    functions = [item for tree in trees for item in tree.body if isinstance(item, ast.FunctionDef)]
    commands = [item for item in functions if any(word in ast.unparse(item.args) for word in ("Option", "Argument"))]
    assert {item.name.removesuffix("_export").removesuffix("_import") for item in commands} >= set(COMMANDS)
    for command in commands:
        used = {node.id for part in command.body for node in ast.walk(part) if isinstance(node, ast.Name)}
        assert [argument.arg for argument in command.args.args if argument.arg not in used] == [], command.name
