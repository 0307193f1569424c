"""Reading files: what is no file, no text or no TOML is said in one line; lines are found for messages."""

from __future__ import annotations

import hashlib
import os
import tomllib
from decimal import Decimal
from pathlib import Path

import pytest

from benchmark.errors import EvenloadError, InputRefused, Problem, UsageError, nearest
from benchmark.sets import files
from benchmark.sets.files import TomlFile, read_toml, shown
from benchmark.sets.problems import Collector


def _problems(path: Path, name: str = "set.toml") -> list[str]:
    collector = Collector()
    assert read_toml(path, collector, name) is None
    return [str(problem) for problem in collector.problems]


def _read(folder: Path, text: str) -> TomlFile:
    path = folder / "set.toml"
    path.write_text(text, encoding="utf-8", newline="")
    collector = Collector()
    file = read_toml(path, collector, "set.toml")
    assert file is not None, collector.problems
    return file


# -- what is no file -------------------------------------------------------------------------------------------


def test_a_missing_file(tmp_path: Path):
    assert _problems(tmp_path / "none.toml") == ["set.toml: does not exist"]


def test_a_folder(tmp_path: Path):
    assert _problems(tmp_path) == ["set.toml: is a folder, a file is needed"]


@pytest.mark.skipif(not Path("/dev/null").exists(), reason="no devices on this system")
@pytest.mark.parametrize("device", ["/dev/null", "/dev/zero"])
def test_a_device_is_not_read(device: str):
    assert _problems(Path(device)) == ["set.toml: is not a regular file"]


def test_a_pipe_is_not_waited_for(tmp_path: Path):
    pipe = tmp_path / "pipe.toml"
    os.mkfifo(pipe)
    assert _problems(pipe) == ["set.toml: is not a regular file"]


def test_a_path_through_a_file(tmp_path: Path):
    (tmp_path / "file").write_text("x")
    assert _problems(tmp_path / "file" / "set.toml") == ["set.toml: cannot be read (Not a directory)"]


def test_a_path_with_a_null_byte():
    assert _problems(Path("a\0b.toml")) == ["set.toml: is not a usable path"]


def test_a_huge_file_is_refused_before_it_is_read(tmp_path: Path):
    path = tmp_path / "huge.toml"
    with path.open("wb") as file:
        file.truncate(5_000_000_000)  # sparse
    assert _problems(path) == ["set.toml: is too large; found 5000000000 bytes; allowed: at most 4000000 bytes"]


def test_the_name_of_a_file_may_have_any_letters(tmp_path: Path):
    assert _problems(tmp_path / "Größe μ 中.toml", "Größe μ 中.toml") == ["Größe μ 中.toml: does not exist"]


# -- what is no text or no TOML --------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "set.toml: is empty"),
        (b" \n\t\n", "set.toml: is empty"),
        (b'title = "\xff"', "set.toml: is not UTF-8 text; found byte 0xff at 9"),
        (b"\xff\xfet\x00", "set.toml: is not UTF-8 text; found byte 0xff at 0"),
        (
            b"\xef\xbb\xbfschema = 1\n",
            "set.toml:1: starts with a byte order mark; allowed: UTF-8 text without it",
        ),
        (b"schema = 1\n\nx = \n", "set.toml:3: is not TOML: Invalid value (at line 3, column 5)"),
        (b"x = 1\nx = 2\n", "set.toml:2: is not TOML: Cannot overwrite a value (at line 2, column 6)"),
        (
            b"[value.a]\nvalue = 1\n[value.a]\nvalue = 2\n",
            "set.toml:3: is not TOML: Cannot declare ('value', 'a') twice (at line 3, column 9)",
        ),
        (
            b"x = 1,5\n",
            "set.toml:1: is not TOML: Expected newline or end of document after a statement (at line 1, column 6)",
        ),
        (b"MZ\x00\x01", "set.toml:1: is not TOML: Expected '=' after a key in a key/value pair (at line 1, column 3)"),
        (b"x = " + b"[" * 20_000, "set.toml: is not usable TOML (RecursionError)"),
        (b"x = " + b"9" * 5_000, "set.toml: is not usable TOML (ValueError)"),
    ],
)
def test_what_is_no_toml(content: bytes, message: str, tmp_path: Path):
    path = tmp_path / "set.toml"
    path.write_bytes(content)
    assert _problems(path) == [message]


def test_a_deeply_nested_file_is_refused_at_the_latest_by_the_schema(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    from benchmark.sets.schema import WiresFile, validate

    file = _read(tmp_path, "schema = 1\n")

    def too_deep(data: object) -> None:
        raise RecursionError

    monkeypatch.setattr(WiresFile, "model_validate", too_deep)
    collector = Collector()
    assert validate(WiresFile, file, collector) is None
    assert [str(problem) for problem in collector.problems] == ["set.toml: is nested too deeply"]


# -- numbers, digest, lines ------------------------------------------------------------------------------------


def test_numbers_arrive_as_they_are_written(tmp_path: Path):
    file = _read(tmp_path, "a = 0.1\nb = 100\nc = 1.50e-3\n")
    assert file.data == {"a": Decimal("0.1"), "b": 100, "c": Decimal("0.00150")}
    assert isinstance(file.data["a"], Decimal)
    assert str(file.data["c"]) == "0.00150"  # digits and exponent of the file: derived values are judged by them


def test_the_digest_is_that_of_the_bytes(tmp_path: Path):
    text = "a = 1\r\n# µ\r\n"
    assert _read(tmp_path, text).sha256 == hashlib.sha256(text.encode()).hexdigest()


LINES = '''\
schema = 1
"quoted" = 2
note = """
[value.not_a_table]
neither = 1
"""
one = """closed on its line"""
literal = \'\'\'
[value.nor_this]
\'\'\'
[value.first]
value = 1
unit = "V"    # [value.in_a_comment]
[ value . spaced ]
value = 2
[[contender]]
technology = "a"
[contender.knobs]
supply = { low = 1 }
[[contender]]
technology = "b"
[contender.knobs]
supply.low = 3
'''


@pytest.mark.parametrize(
    ("dotted", "line"),
    [
        ("schema", 1),
        ("quoted", 2),
        ("note", 3),
        ("value.not_a_table", 0),
        ("neither", 0),
        ("one", 7),
        ("literal", 8),
        ("value.first", 11),
        ("value.first.value", 12),
        ("value.first.unit", 13),
        ("value.first.spread.low", 11),
        ("value.spaced.value", 15),
        ("value", 11),
        ("contender.0.technology", 17),
        ("contender.0.knobs.supply", 19),
        ("contender.1", 20),
        ("contender.1.knobs.supply.low", 23),
        ("contender", 16),
        ("nowhere", 0),
    ],
)
def test_lines_of_names(dotted: str, line: int, tmp_path: Path):
    assert tomllib.loads(LINES)
    assert _read(tmp_path, LINES).line(dotted) == line


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (True, "true"),
        (Decimal("1.50"), "1.50"),
        (7, "7"),
        ("text", "'text'"),
        ({"a": 1}, "a table"),
        ([1], "a list"),
        ("x" * 100, "'" + "x" * 56 + "..."),
        ("\x1b[31m", "'\\x1b[31m'"),
    ],
)
def test_values_are_shown_as_they_were_written(value: object, text: str):
    assert shown(value) == text


# -- problems --------------------------------------------------------------------------------------------------


def test_a_problem_reads_from_place_to_remedy():
    problem = Problem("set.toml", 3, "value.x", "is wrong", "'a'", "b, c", "did you mean 'b'?")
    assert str(problem) == "set.toml:3: value.x: is wrong; found 'a'; allowed: b, c; did you mean 'b'?"
    assert str(Problem("set.toml", 0, "", "is wrong")) == "set.toml: is wrong"


def test_a_refusal_lists_every_problem_once_in_order_of_place():
    problems = [
        Problem("b", 1, "x", "w"),
        Problem("a", 10, "x", "w"),
        Problem("a", 9, "x", "w"),
        Problem("a", 9, "x", "w"),
    ]
    refused = InputRefused(problems)
    assert [(problem.file, problem.line) for problem in refused.problems] == [("a", 9), ("a", 10), ("b", 1)]
    assert str(refused) == "a:9: x: w\na:10: x: w\nb:1: x: w"


def test_the_collector_refuses_only_for_problems():
    collector = Collector()
    collector.warn(Problem("a", 1, "", "warned"))
    collector.note(Problem("a", 1, "", "noted"))
    collector.raise_if_any()
    collector.add(Problem("a", 1, "", "refused"))
    with pytest.raises(InputRefused):
        collector.raise_if_any()


def test_every_error_of_a_user_is_of_one_family():
    assert issubclass(InputRefused, EvenloadError)
    assert issubclass(UsageError, EvenloadError)


@pytest.mark.parametrize(
    ("name", "hint"),
    [("resistence", "did you mean 'resistance'?"), ("zzz", ""), ("resistance", "did you mean 'resistance'?")],
)
def test_the_nearest_name(name: str, hint: str):
    assert nearest(name, ["resistance", "current"]) == hint


def test_the_size_limit_is_far_above_any_file_written_by_hand():
    assert files.MAX_BYTES == 4_000_000
