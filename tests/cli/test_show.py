"""``evenload show``: what there is, everything about one name, and where each number comes from."""

from __future__ import annotations

import os
import pty
import re
import subprocess
import sys
from pathlib import Path

import pytest

from benchmark.catalogue import EVIDENCE, PRODUCT_CLASSES, QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.cli.layout import Facts, Note, Table, plain_lines, printable
from benchmark.devices import MODEL_NAMES, model
from benchmark.sets.library import shipped_nodes
from benchmark.sets.study import REQUIREMENTS
from tests.cli.conftest import Run
from tests.refusals import CIRCUIT, SOURCES, TECHNOLOGY, WIRES

ROOT = Path(__file__).resolve().parents[2]
SHIPPED = {
    folder: [path.stem for path in sorted((shipped_nodes() / folder).glob("*.toml"))]
    for folder in ("technologies", "wires")
}


def _first_words(text: str) -> set[str]:
    return {line.split()[0] for line in text.splitlines() if line.strip()}


# -- lists -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("what", "names"),
    [
        ("technologies", SHIPPED["technologies"]),
        ("wires", SHIPPED["wires"]),
        ("circuits", list(BUILT_IN)),
        ("models", list(MODEL_NAMES)),
        ("values", list(QUANTITIES)),
        ("sources", ["invented", "team-choice"]),
        ("requirements", list(REQUIREMENTS)),
        ("evidence", list(EVIDENCE)),
        ("classes", [name.split()[0] for name in PRODUCT_CLASSES]),
    ],
)
@pytest.mark.parametrize("columns", ["60", "100", "200"])
def test_lists_name_everything_and_keep_to_the_width(
    what: str, names: list[str], columns: str, evenload: Run, monkeypatch: pytest.MonkeyPatch
):
    monkeypatch.setenv("COLUMNS", columns)
    ran = evenload("show", what)
    assert (ran.status, ran.err) == (0, "")
    assert max(len(line) for line in ran.out.splitlines()) <= int(columns)
    words = set(ran.out.split())
    # in a narrow table a name may be broken; the letters are all there, in order
    letters = "".join(ran.out.split())
    assert all(name in words or name in letters or int(columns) < 100 for name in names)
    assert len(names) > 1 or what == "wires"


def test_technologies_are_the_default_and_show_model_nodes_and_ambition(evenload: Run):
    plain, named = evenload("show"), evenload("show", "technologies")
    assert plain.out == named.out
    line = next(line for line in plain.out.splitlines() if line.startswith("  demo-stress-gated"))
    assert "stress-gated" in line
    assert "g1, g2, g3" in line
    assert line.endswith("target")


def test_a_users_folder_is_listed_with_what_ships_and_sorted_by_kind(tmp_path: Path, evenload: Run):
    (tmp_path / "mine" / "circuits").mkdir(parents=True)
    (tmp_path / "mine" / "switch.toml").write_text(TECHNOLOGY)
    (tmp_path / "mine" / "lines.toml").write_text(WIRES)
    (tmp_path / "mine" / "circuits" / "word-line.toml").write_text(CIRCUIT)
    (tmp_path / "mine" / "sources.toml").write_text(SOURCES)
    listed = {
        what: _first_words(evenload("show", what, "--nodes", "mine").out)
        for what in ("technologies", "wires", "circuits", "sources")
    }
    assert {"switch", "demo-given"} <= listed["technologies"]
    assert not {"lines", "word-line", "sources"} & listed["technologies"]
    assert "lines" in listed["wires"]
    assert "switch" not in listed["wires"]
    assert {"word-line", "ring"} <= listed["circuits"]
    assert "film-batch" in listed["sources"]


def test_a_file_that_cannot_be_read_is_listed_as_such(tmp_path: Path, evenload: Run, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("COLUMNS", "200")
    (tmp_path / "mine" / "technologies").mkdir(parents=True)
    (tmp_path / "mine" / "technologies" / "broken.toml").write_text("x = [")
    ran = evenload("show", "technologies", "--nodes", "mine")
    assert ran.status == 0
    assert re.search(r"broken +not readable: evenload check", ran.out)


# -- one name --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "name", [*SHIPPED["technologies"], *SHIPPED["wires"], *BUILT_IN, *MODEL_NAMES, *REQUIREMENTS, *EVIDENCE, "invented"]
)
def test_everything_that_is_listed_can_be_shown(name: str, evenload: Run):
    ran = evenload("show", name)
    assert (ran.status, ran.err) == (0, "")
    assert name in ran.out
    assert max(len(line) for line in ran.out.splitlines()) <= 100


@pytest.mark.parametrize("name", QUANTITIES)
def test_every_value_name_can_be_shown_and_is_used_by_something(name: str, evenload: Run):
    ran = evenload("show", name)
    assert ran.status == 0
    flat = " ".join(ran.out.split())
    assert QUANTITIES[name].meaning in flat
    users = ran.out.partition("Used by")[2].splitlines()[3:]
    assert users, "a name that nothing uses should not be in the catalogue"


@pytest.mark.parametrize("name", MODEL_NAMES)
def test_a_model_shows_its_inputs_options_and_references(name: str, evenload: Run):
    flat = " ".join(evenload("show", name).out.split())
    for item in model(name).inputs:
        assert item.name in flat
    for option in model(name).options:
        assert f"{option.name} " in flat
    for text in model(name).references:
        assert " ".join(text.split()) in flat


def test_a_value_with_its_whole_provenance(tmp_path: Path, evenload: Run):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "sources.toml").write_text(SOURCES)
    text = TECHNOLOGY.replace(
        "g2 = 40.0 }\n",
        'g2 = 40.0 }\nspread = { shape = "lognormal", factor = 1.5 }\nevidence = "measured"\nsource = "film-batch"\n'
        'where = "row 4"\nconditions = "25 degC"\nnote = "best of three"\nbound = "at-most"\ndate = 2026-01-31\n',
    )
    (tmp_path / "mine" / "switch.toml").write_text(text)
    ran = evenload("show", "switch.on_resistance", "--nodes", "mine")
    facts = dict(re.findall(r"^  (\S.*?)  +(\S.*)$", ran.out, flags=re.MULTILINE))
    assert facts["value at g1"] == "50 kohm = 50000.0 in SI"
    assert facts["value at g2"] == "40 kohm = 40000.0 in SI"
    assert facts["spread"] == "lognormal, central 95 % within a factor 1.5"
    assert facts["evidence"] == "measured: our samples, at use conditions; may carry any verdict"
    assert facts["source"] == "film-batch: example team (fictional): Batch (2026) [read]"
    assert facts["where"] == "row 4"
    assert facts["conditions"] == "25 degC"
    assert facts["note"] == "best of three"
    assert facts["bound"] == "an upper bound"
    assert facts["date"] == "2026-01-31"
    assert facts["set by"] == "user"
    assert facts["file"] == "switch.toml:16"
    assert facts["model"] == "given: required"


def test_a_default_is_shown_as_one_with_its_origin(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY)
    ran = evenload("show", "switch.terminal_capacitance", "--nodes", ".")
    assert re.search(r"set by +default: not stated: no capacitance of the conducting terminals", ran.out)
    whole = evenload("show", "switch", "--nodes", ".").out
    line = next(line for line in whole.splitlines() if line.startswith("  terminal_capacitance"))
    assert line.endswith("default")
    assert "Not stated and without a default, so unknown: footprint" in whole


def test_options_and_silent_inputs_of_a_technology(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY)
    assert re.search(r"chosen +resistance\n", evenload("show", "switch.off_state", "--nodes", ".").out)
    assert re.search(r"value +not stated\n", evenload("show", "switch.footprint", "--nodes", ".").out)


@pytest.mark.parametrize(
    ("spread", "words"),
    [
        ('{ shape = "uniform", low = 0.6, high = 0.8 }', "uniform, 0.6 to 0.8"),
        ('{ shape = "normal", sd = 0.05 }', "normal, standard deviation 0.05"),
        ('{ shape = "normal", percent = 10 }', "normal, standard deviation 0.07"),
        ('{ shape = "lognormal", factor = 1.2 }', "lognormal, central 95 % within a factor 1.2"),
    ],
)
def test_spreads_in_words(spread: str, words: str, tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY.replace("value = 0.7\n", f"value = 0.7\nspread = {spread}\n"))
    assert re.search(rf"spread +{re.escape(words)}\n", evenload("show", "switch.switching_level", "--nodes", ".").out)


def test_anchors_stand_beside_what_the_set_predicts(tmp_path: Path, evenload: Run, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("COLUMNS", "200")
    anchor = '[anchor.on_current]\nvalue = 20.0\nunit = "A/m"\nsource = "invented"\nnode = "g1"\nwhere = "table 1"\n'
    (tmp_path / "switch.toml").write_text(TECHNOLOGY + anchor)
    line = next(line for line in evenload("show", "switch", "--nodes", ".").out.splitlines() if "table 1" in line)
    # 0.5 V over 50 kohm, no width stated: 10 uA against the published 20
    assert line.split()[:9] == ["on_current", "g1", "20", "1e-05", "A/m", "-100.00", "%", "0.5", "V"]
    assert "predicted" in line


def test_a_source_shows_who_cites_it(tmp_path: Path, evenload: Run):
    (tmp_path / "sources.toml").write_text(SOURCES)
    (tmp_path / "switch.toml").write_text(TECHNOLOGY.replace('source = "invented"', 'source = "film-batch"'))
    out = evenload("show", "film-batch", "--nodes", ".").out
    assert re.search(r"  switch +technology\n", out)
    (tmp_path / "switch.toml").write_text(TECHNOLOGY)
    assert "none of the sets" in evenload("show", "film-batch", "--nodes", ".").out


def test_a_circuit_file_shows_its_nets(tmp_path: Path, evenload: Run, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("COLUMNS", "160")
    (tmp_path / "circuits").mkdir()
    (tmp_path / "circuits" / "word-line.toml").write_text(CIRCUIT)
    flat = " ".join(evenload("show", "word-line", "--nodes", ".").out.split())
    assert "line inverter 2 x nand2.a 1 fF 500 um on upper 1.8 V (set by the cell) 0.5 1 1" in flat


def test_a_name_of_several_things_shows_all_of_them(tmp_path: Path, evenload: Run):
    (tmp_path / "given.toml").write_text(TECHNOLOGY.replace('id = "switch"', 'id = "given"'))
    out = evenload("show", "given", "--nodes", ".").out
    assert "Technology given\n" in out
    assert "Device model given\n" in out


# -- what there is not -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("demo-givn", "there is nothing named 'demo-givn'; did you mean 'demo-given'? lists are technologies, "),
        ("deadlin", "there is nothing named 'deadlin'; did you mean 'deadline'? lists are technologies, "),
        ("zzzz", "there is nothing named 'zzzz'; lists are technologies, wires, circuits, models, values, sources, "),
        ("", "there is nothing named ''; lists are "),
        ("../nodes", "there is nothing named '../nodes'; lists are "),
        ("demo-given.heigt", "demo-given has no value 'heigt'; did you mean 'height'?"),
        ("demo-given.zzzz", "demo-given has no value 'zzzz'; evenload show demo-given lists them"),
    ],
)
def test_an_unknown_name_is_wrong_usage_with_the_nearest_one(name: str, message: str, evenload: Run):
    ran = evenload("show", name)
    assert (ran.status, ran.out) == (2, "")
    assert ran.err.startswith(f"evenload: {message}")


def test_a_set_with_problems_is_refused_with_all_of_them(tmp_path: Path, evenload: Run):
    (tmp_path / "switch.toml").write_text(TECHNOLOGY.replace("value = 0.7", "value = 7").replace('"Mohm"', '"V"'))
    for name in ("switch", "switch.on_resistance"):
        ran = evenload("show", name, "--nodes", ".")
        assert (ran.status, ran.out) == (3, "")
        assert ran.err.startswith("evenload: input refused, 2 problem(s)")


def test_a_bad_source_list_is_refused(tmp_path: Path, evenload: Run):
    (tmp_path / "sources.toml").write_text(SOURCES.replace("2026", '"soon"'))
    assert evenload("show", "sources", "--nodes", ".").status == 3


# -- layout ----------------------------------------------------------------------------------------------------

HOSTILE = "\x1b[31mred\x07\u202e[bold]markup[/bold]"


def test_no_text_of_a_file_can_steer_the_terminal(tmp_path: Path, evenload: Run, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv("COLUMNS", "200")
    title = "\\u001b[31mred\\u0007\\u202e[bold]markup[/bold]"
    (tmp_path / "switch.toml").write_text(TECHNOLOGY.replace('title = "Switch"', f'title = "{title}"'))
    for what in ("technologies", "switch"):
        out = evenload("show", what, "--nodes", ".").out
        assert "[bold]markup[/bold]" in out
        assert not re.search("[\x00-\x09\x0b-\x1f\u202e]", out)
    assert printable(HOSTILE) == " [31mred  [bold]markup[/bold]"


@pytest.mark.parametrize("width", range(20, 130, 7))
def test_plain_text_never_exceeds_the_width(width: int):
    blocks = [
        Table(
            "A title of some words",
            ("name", "meaning", "unit"),
            [("x" * 12, "many words " * 9, "u" * 30), ("y", "", "1")],
        ),
        Facts("Facts", [("a name", "a text " * 20), ("", "z" * 200), ("n" * 60, "")]),
        Note("A paragraph of words. " * 8),
        Table("", ("only",), []),
    ]
    lines = plain_lines(blocks, width)
    assert max(len(line) for line in lines) <= width
    letters = "".join("".join(lines).split())
    assert letters.count("u") >= 30
    assert "z" * 20 in letters


def _on_a_terminal(arguments: list[str], **environment: str) -> str:
    """What the program writes to a real terminal."""
    leader, follower = pty.openpty()
    env = {"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT), "COLUMNS": "90", "LC_ALL": "C.UTF-8", **environment}
    process = subprocess.Popen(
        [sys.executable, "-m", "benchmark", *arguments], stdout=follower, stderr=follower, env=env
    )
    os.close(follower)
    chunks = []
    while True:
        try:
            chunk = os.read(leader, 65536)
        except OSError:
            break
        if not chunk:
            break
        chunks.append(chunk)
    assert process.wait(timeout=60) == 0
    os.close(leader)
    return b"".join(chunks).decode("utf-8")


def test_a_terminal_gets_a_table_a_dumb_one_plain_text_and_no_color_no_colour():
    rich, dumb = (_on_a_terminal(["show", "wires"], TERM=term) for term in ("xterm-256color", "dumb"))
    plain = _on_a_terminal(["show", "wires"], TERM="xterm-256color", NO_COLOR="1")
    assert "─" in rich
    assert "\x1b[" not in dumb
    assert "hand-no-wires" in rich
    assert "hand-no-wires" in dumb
    assert not re.search(r"\x1b\[[0-9;]*(3[0-9]|4[0-9]|9[0-9])[0-9;]*m", plain)


def test_a_terminal_without_unicode_is_no_reason_to_stop():
    env = {
        "PATH": os.environ["PATH"],
        "PYTHONPATH": str(ROOT),
        "PYTHONIOENCODING": "ascii",
        "PYTHONUTF8": "0",
        "LC_ALL": "C",
    }
    done = subprocess.run(
        [sys.executable, "-m", "benchmark", "show", "sources"], env=env, capture_output=True, check=False, timeout=60
    )
    assert done.returncode == 0
    assert done.stdout.isascii()
