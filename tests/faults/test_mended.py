"""Inputs that once let an exception or a warning out, or gave a message nobody could use: each with its message now."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests import refusals
from tests.refusals import Said, check

HEX = "0x" + "f" * 6000


def _spoiled(folder: Path, old: str, new: str, kind: str = "technology") -> Said:
    texts: dict[str, str | bytes] = dict(refusals.files(kind))
    name = next(iter(texts))
    text = str(texts[name])
    assert text.count(old) == 1
    texts[name] = text.replace(old, new)
    return check(folder, texts)


def test_a_whole_number_of_thousands_of_digits(tmp_path: Path):
    said = _spoiled(tmp_path, "[value.declared_supply]\nvalue = 0.5", f"[value.declared_supply]\nvalue = {HEX}")
    assert said.refused == [
        "switch.toml:14: value.declared_supply.value: the number is beyond the range of the program (1e-300 to 1e300); "
        "found a whole number of about 7225 digits"
    ]


@pytest.mark.parametrize("key", ["schema", "id", "title"])
def test_such_a_number_where_something_else_is_due(key: str, tmp_path: Path):
    line = next(line for line in refusals.TECHNOLOGY.splitlines() if line.startswith(f"{key} ="))
    (message,) = _spoiled(tmp_path, line, f"{key} = {HEX}").refused
    assert message.startswith(f"switch.toml:{1 + refusals.TECHNOLOGY.splitlines().index(line)}: {key}: ")
    assert "found a whole number of about 7225 digits" in message


@pytest.mark.parametrize(("key", "old"), [("search.supply_points", "supply_points = 13")])
def test_a_count_of_a_study_too_large_to_be_one(key: str, old: str, tmp_path: Path):
    (message,) = _spoiled(tmp_path, old, old.replace("13", "9" * 400), "study").refused
    assert f"{key}: the number is beyond the range of the program (1e9)" in message


@pytest.mark.parametrize("letter", ["\u2028", "\u2029", "\x85"])
def test_letters_that_are_line_ends_elsewhere_do_not_shift_the_lines(letter: str, tmp_path: Path):
    said = _spoiled(tmp_path, 'title = "Switch"', f'title = "Swi{letter}tch"\nflavor = "a"')
    assert [message.split(" ")[:2] for message in said.refused] == [["switch.toml:4:", "flavor:"]]


def test_the_last_line_of_a_file_that_ends_too_early(tmp_path: Path):
    (message,) = check(tmp_path, {"switch.toml": "a = 1 # \u2028\n[value"}).refused
    assert message.startswith("switch.toml:2: is not TOML: ")


@pytest.mark.parametrize("formula", ["0x1for x in y", "1if 1else 2", "1 is 1", "closing_delay\\\\"])
def test_a_formula_python_only_warns_about(formula: str, tmp_path: Path):
    said = _derived(tmp_path, formula)
    (message,) = said.refused
    assert ": value.opening_delay.formula: " in message


@pytest.mark.parametrize("formula", ["1e999", "-1e999", "closing_delay + 1e999", "1e300 * 1e300", "10**400"])
def test_a_formula_beyond_all_numbers(formula: str, tmp_path: Path):
    said = _derived(tmp_path, formula)
    assert [message.partition(": ")[2] for message in said.refused] == [
        f"value.opening_delay.formula: cannot be computed with these values; found {formula!r}"
    ]


def _derived(folder: Path, formula: str) -> Said:
    old = '[value.opening_delay]\nvalue = 0.05\nunit = "ns"\n'
    return _spoiled(folder, old, f'{old}evidence = "derived"\nformula = "{formula}"\n')


@pytest.mark.parametrize("shape", ['shape = "uniform", low = 0.01, high = 1e300', 'shape = "normal", sd = 1e300'])
def test_a_spread_beyond_all_numbers(shape: str, tmp_path: Path):
    old = '[value.input_capacitance]\nvalue = 0.25\nunit = "fF"\n'
    new = f'[value.input_capacitance]\nvalue = 1e-12\nunit = "Gm^3*GF/m^3"\nunusual = true\nspread = {{ {shape} }}\n'
    said = _spoiled(tmp_path, old, new)
    assert len(said.refused) == 1
    assert "value.input_capacitance.spread: " in said.refused[0]


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("[option]", "[" + "k" * 1_000_000 + "]"),
        ('title = "Switch"', "k" * 1_000_000 + ' = "Switch"'),
        ('unit = "fF"', 'unit = "' + "V" * 19_000 + '"'),
        ('model = "given"', 'model = "' + "given" * 3_000 + '"'),
    ],
)
def test_a_message_can_be_read_whatever_the_file_says(old: str, new: str, tmp_path: Path):
    said = _spoiled(tmp_path, old, new)
    assert said.refused
    assert max(map(len, said.refused)) < 5000
    assert all(message.startswith("switch.toml:") for message in said.refused)


def test_a_key_of_half_a_million_parts_is_looked_up_at_once(tmp_path: Path):
    said = _spoiled(tmp_path, 'title = "Switch"', '"' + "a: " * 300_000 + "." * 500_000 + '" = 1\ntitle = "Switch"')
    (message,) = said.refused
    assert "is not a known name here" in message


@pytest.mark.parametrize(
    ("text", "line"),
    [("\n[" + "a." * 1_900_000 + "a]\n", 37), ("\n\n" + "a . " * 900_000 + "a = 1\n", 38)],
)
def test_a_name_of_endless_parts(text: str, line: int, tmp_path: Path):
    said = check(tmp_path, {"switch.toml": refusals.TECHNOLOGY + text})
    assert said.refused == [f"switch.toml:{line}: is nested too deeply"]


def test_a_table_of_endless_columns(tmp_path: Path):
    columns = [f"c{number}" for number in range(300_000)]
    files = {**refusals.files("table"), "tables/curve.csv": ",".join(columns) + "\n1\n"}
    assert check(tmp_path, dict(files)).refused == [
        "tables/curve.csv:1: has too many columns; found 300000; allowed: at most 200"
    ]


def test_endless_nodes(tmp_path: Path):
    many = ", ".join('"g1"' for _ in range(100_000))
    said = _spoiled(tmp_path, 'nodes = ["g1", "g2"]', f'nodes = ["g1", "g2", {many}]')
    assert "switch.toml:5: nodes: names a node twice; found 'g1'" in said.refused


@pytest.mark.parametrize("digits", [1_001, 3_900_000])
def test_a_number_of_endless_digits(digits: int, tmp_path: Path):
    old = "[value.declared_supply]\nvalue = 0.5"
    said = _spoiled(tmp_path, old, f"{old[:-1]}{'5' * digits}")
    (message,) = said.refused
    assert "value.declared_supply.value: the number has more than 1000 digits" in message
    files = {**refusals.files("table"), "tables/curve.csv": refusals.CURVE.replace("1e-12", "0." + "1" * digits)}
    (message,) = check(tmp_path, dict(files)).refused
    assert message.startswith("tables/curve.csv:2: ")


@pytest.mark.parametrize("cell", ["٣e-12", "１e-12", "1e-１2", "−1e-12"])
def test_digits_of_another_script_in_a_table(cell: str, tmp_path: Path):
    files = {**refusals.files("table"), "tables/curve.csv": refusals.CURVE.replace("0.3,25,1e-12", f"0.3,25,{cell}")}
    (message,) = check(tmp_path, dict(files)).refused
    assert message.startswith(f"tables/curve.csv:2: I: is not a number; found {cell!r}")
