"""Spoiling text at random, the same way every time: one function per kind of damage.

A mutator takes the text of a file and a source of random choices and returns the new bytes; it may return the text
unchanged when the file has nothing of its kind. All choices come from the given generator, so a mutant is known by the
name of its seed and its number.
"""

from __future__ import annotations

import math
import random
import re
from collections.abc import Callable

from tests.faults.pools import BYTES, CELLS, FORMULAS, HEADERS, KEYS, LETTERS, NUMBERS, OTHER_TYPES, UNITS, WORDS

__all__ = ["CSV_MUTATORS", "TOML_MUTATORS", "mutate"]

Mutator = Callable[[str, random.Random], str | bytes]

#: a string, a date, a number or a truth word where a value may stand, or the key before an equals sign
TOKEN = re.compile(
    r'"(?:[^"\\\n]|\\.)*"|\d{4}-\d\d-\d\d|[+-]?\d[\d_]*(?:\.\d+)?(?:[eE][+-]?\d+)?|\btrue\b|\bfalse\b'
    r"|[A-Za-z_][A-Za-z0-9_\-]*(?=\s*=)"
)
NUMBER = re.compile(r"(?<![\w\".\-])[+-]?\d+(?:\.\d+)?(?:[eE][+-]?\d+)?(?![\w\"\-])")
STRING = re.compile(r'"(?:[^"\\\n]|\\.)*"')
KEY = re.compile(r"(?m)(?:^|[{,])\s*([A-Za-z_][A-Za-z0-9_\-]*)(?=\s*=)")
UNIT = re.compile(r'(?<=unit = )"[^"\n]*"')


def _pick(pattern: re.Pattern[str], text: str, rng: random.Random, new: str, group: int = 0) -> str:
    """Replace one match of the pattern, chosen at random."""
    found = list(pattern.finditer(text))
    if not found:
        return text
    match = rng.choice(found)
    return text[: match.start(group)] + new + text[match.end(group) :]


def _lines(text: str) -> list[str]:
    return text.splitlines(keepends=True)


def _blocks(text: str) -> list[str]:
    """The parts of a file that begin with a table header."""
    return re.split(r"(?m)^(?=\[)", text)


# -- damage to any text ----------------------------------------------------------------------------------------


def truncate(text: str, rng: random.Random) -> bytes:
    raw = text.encode()
    return raw[: rng.randrange(len(raw) + 1)]


def flip_bytes(text: str, rng: random.Random) -> bytes:
    raw = bytearray(text.encode())
    for _ in range(rng.choice([1, 1, 1, 2, 5, 40])):
        if raw:
            raw[rng.randrange(len(raw))] ^= 1 << rng.randrange(8)
    return bytes(raw)


def insert_bytes(text: str, rng: random.Random) -> bytes:
    raw = text.encode()
    at = rng.randrange(len(raw) + 1)
    return raw[:at] + rng.choice(BYTES) + raw[at:]


def insert_letter(text: str, rng: random.Random) -> str:
    at = rng.choice([0, rng.randrange(len(text) + 1), rng.randrange(len(text) + 1), len(text)])
    return text[:at] + rng.choice(LETTERS) * rng.choice([1, 1, 2]) + text[at:]


def delete_letters(text: str, rng: random.Random) -> str:
    at = rng.randrange(len(text) + 1)
    return text[:at] + text[at + rng.choice([1, 1, 1, 3, 20]) :]


def replace_letter(text: str, rng: random.Random) -> str:
    at = rng.randrange(max(1, len(text)))
    return text[:at] + rng.choice([*LETTERS, "a", "_", "0"]) + text[at + 1 :]


def drop_line(text: str, rng: random.Random) -> str:
    lines = _lines(text)
    if lines:
        del lines[rng.randrange(len(lines))]
    return "".join(lines)


def repeat_line(text: str, rng: random.Random) -> str:
    lines = _lines(text)
    if lines:
        lines.insert(rng.randrange(len(lines) + 1), rng.choice(lines))
    return "".join(lines)


def swap_lines(text: str, rng: random.Random) -> str:
    lines = _lines(text)
    a, b = rng.randrange(len(lines)), rng.randrange(len(lines))
    lines[a], lines[b] = lines[b], lines[a]
    return "".join(lines)


def empty(text: str, rng: random.Random) -> bytes:
    return rng.choice(
        [b"", b" ", b"\n\n", b"#", b"\x00" * 64, b"\xef\xbb\xbf", b"\x89PNG\r\n\x1a\n\x00", b"PK\x03\x04", b"\x1f\x8b"]
    )


def other_encoding(text: str, rng: random.Random) -> bytes:
    return text.encode(rng.choice(["utf-16", "utf-16-le", "utf-32", "utf-8-sig", "cp037", "utf-7"]), "replace")


def line_ends(text: str, rng: random.Random) -> str:
    return text.replace("\n", rng.choice(["\r", "\r\n", "\n\r", "\x85", "\u2028", "\n\n", "\r\r\n"]))


def random_bytes(text: str, rng: random.Random) -> bytes:
    return rng.randbytes(rng.choice([1, 7, 300, 5000]))


# -- damage to TOML --------------------------------------------------------------------------------------------


def number(text: str, rng: random.Random) -> str:
    return _pick(NUMBER, text, rng, rng.choice(NUMBERS))


def scale_number(text: str, rng: random.Random) -> str:
    found = list(NUMBER.finditer(text))
    if not found:
        return text
    match = rng.choice(found)
    factor = rng.choice([1.0001, 1.1, 2.0, 0.5, 10.0, 1e3, 1e-3, 1e6, -1.0])
    new = float(match[0]) * factor
    written = repr(new) if rng.random() < 0.7 or math.isinf(new) else str(round(new))
    return text[: match.start()] + written + text[match.end() :]


def other_type(text: str, rng: random.Random) -> str:
    return _pick(TOKEN, text, rng, rng.choice(OTHER_TYPES))


def word(text: str, rng: random.Random) -> str:
    return _pick(STRING, text, rng, '"' + rng.choice(WORDS) + '"')


def word_of_file(text: str, rng: random.Random) -> str:
    """A word of the file at the place of another."""
    words = STRING.findall(text) or ['""']
    return _pick(STRING, text, rng, rng.choice(words))


def unit(text: str, rng: random.Random) -> str:
    return _pick(UNIT, text, rng, '"' + rng.choice(UNITS) + '"')


def rename_key(text: str, rng: random.Random) -> str:
    return _pick(KEY, text, rng, rng.choice(KEYS), group=1)


def key_of_file(text: str, rng: random.Random) -> str:
    keys = [match[1] for match in KEY.finditer(text)] or ["a"]
    return _pick(KEY, text, rng, rng.choice(keys), group=1)


def misspell_key(text: str, rng: random.Random) -> str:
    found = list(KEY.finditer(text))
    if not found:
        return text
    match = rng.choice(found)
    at = rng.randrange(match.start(1), match.end(1))
    return text[:at] + rng.choice(["", "x", "_", "e", "é"]) + text[at + rng.choice([0, 1]) :]


def drop_block(text: str, rng: random.Random) -> str:
    blocks = _blocks(text)
    del blocks[rng.randrange(len(blocks))]
    return "".join(blocks)


def repeat_block(text: str, rng: random.Random) -> str:
    blocks = _blocks(text)
    blocks.insert(rng.randrange(len(blocks) + 1), rng.choice(blocks))
    return "".join(blocks)


def move_block(text: str, rng: random.Random) -> str:
    blocks = _blocks(text)
    blocks.insert(rng.randrange(len(blocks)), blocks.pop(rng.randrange(len(blocks))))
    return "".join(blocks)


def header(text: str, rng: random.Random) -> str:
    """Another name, more parts, or other brackets in a header."""
    new = rng.choice(HEADERS)
    return _pick(re.compile(r"(?m)^\[+[^\]\n]*\]+"), text, rng, new)


def nest(text: str, rng: random.Random) -> str:
    """Arrays, inline tables or dotted names up to some thousand levels deep."""
    depth = rng.choice([2, 30, 90, 200, 1000, 3000])
    shape = rng.randrange(5)
    if shape == 0:
        return _pick(TOKEN, text, rng, "[" * depth + "]" * depth)
    if shape == 1:
        return _pick(TOKEN, text, rng, "{a=" * depth + "1" + "}" * depth)
    if shape == 2:
        return text + "\n[" + ".".join(["a"] * depth) + "]\n"
    if shape == 3:
        return _pick(KEY, text, rng, ".".join(["a"] * depth), group=1)
    return text + "\n" + "".join(f"[{'.'.join(['value', *['a'] * level])}]\n" for level in range(min(depth, 150)))


def long_text(text: str, rng: random.Random) -> str:
    """A megabyte where a word, a key, a comment or a unit stands."""
    size = rng.choice([20_001, 100_000, 1_000_000])
    letters = rng.choice(["a", "é", "\u202e", "[", " ", "V ", "9", "\\n"]) * size
    shape = rng.randrange(5)
    if shape == 0:
        return _pick(STRING, text, rng, f'"{letters[:size]}"')
    if shape == 1:
        return _pick(KEY, text, rng, "k" * size, group=1)
    if shape == 2:
        return text + "\n# " + letters.replace("\\n", " ")[:size] + "\n"
    if shape == 3:
        return _pick(UNIT, text, rng, f'"{letters[:size]}"')
    return _pick(STRING, text, rng, "[" + '"a",' * (size // 20) + "]")


def many_tables(text: str, rng: random.Random) -> str:
    name = rng.choice(["value", "x", "anchor", "layer", "requirements", "candidate.overhead"])
    return text + "\n" + "".join(f"[{name}.k{number}]\n" for number in range(rng.choice([50, 2000])))


def formula(text: str, rng: random.Random) -> str:
    """A derived value: its formula at random."""
    said = f'evidence = "derived"\nformula = "{rng.choice(FORMULAS)}"\n'
    blocks = _blocks(text)
    places = [at for at, block in enumerate(blocks) if re.match(r"\[value\.", block)]
    if not places:
        return _pick(STRING, text, rng, f'"{rng.choice(FORMULAS)}"')
    for at in rng.sample(places, k=min(len(places), rng.choice([1, 1, 2]))):
        blocks[at] = blocks[at].rstrip("\n") + "\n" + said
    return "".join(blocks)


def spread(text: str, rng: random.Random) -> str:
    """A spread at random on a value."""
    low, high = rng.choice(NUMBERS), rng.choice(NUMBERS)
    limits = f"low = {low}, high = {high}"
    said = rng.choice(
        [
            f'shape = "uniform", {limits}',
            f'shape = "loguniform", {limits}',
            f'shape = "triangular", {limits}',
            f'shape = "normal", sd = {low}',
            f'shape = "normal", percent = {high}',
            f'shape = "lognormal", factor = {low}',
            f'shape = "lognormal", ln_sd = {high}',
            f'shape = "cauchy", {limits}',
            f'shape = "lognormal", factor = {low}, ln_sd = {high}',
            f'shape = ["uniform"], {limits}',
            'shape = "normal"',
            "",
        ]
    )
    blocks = _blocks(text)
    places = [at for at, block in enumerate(blocks) if re.match(r"\[value\.", block)]
    if not places:
        return text
    at = rng.choice(places)
    kept = [line for line in _lines(blocks[at]) if not line.startswith("spread")]
    blocks[at] = "".join(kept).rstrip("\n") + f"\nspread = {{ {said} }}\n"
    return "".join(blocks)


# -- damage to tables ------------------------------------------------------------------------------------------


def csv_cell(text: str, rng: random.Random) -> str:
    cells = [*NUMBERS, *CELLS]
    return _pick(re.compile(r"[^,;\n]+"), text, rng, rng.choice(cells))


def csv_dialect(text: str, rng: random.Random) -> str:
    return text.replace(",", rng.choice([";", "\t", " ", "|", ",,", '","', ", ", "،"]))


def csv_quote(text: str, rng: random.Random) -> str:
    at = rng.randrange(len(text) + 1)
    return text[:at] + rng.choice(['"', '""', '"a\n', '"\x00', "'", '","']) + text[at:]


def csv_ragged(text: str, rng: random.Random) -> str:
    lines = _lines(text)
    at = rng.randrange(len(lines))
    lines[at] = lines[at].rstrip("\n") + rng.choice([",", ",1", ",,,,", ""]) + "\n"
    other = rng.randrange(len(lines))
    lines[other] = lines[other].partition(",")[rng.choice([0, 2])].rstrip("\n") + "\n"
    return "".join(lines)


def csv_long(text: str, rng: random.Random) -> str:
    size = rng.choice([5_000, 140_000, 1_000_000])
    return _pick(re.compile(r"[^,;\n]+"), text, rng, rng.choice("19a. ") * size)


def csv_many(text: str, rng: random.Random) -> str:
    return text + text.partition("\n")[2] * rng.choice([1, 3, 100])


ANY: list[Mutator] = [
    truncate, flip_bytes, flip_bytes, insert_bytes, insert_letter, insert_letter, delete_letters, replace_letter,
    drop_line,
    repeat_line, swap_lines, empty, other_encoding, line_ends, random_bytes,
]  # fmt: skip
TOML_MUTATORS: list[Mutator] = [
    *ANY, number, number, number, scale_number, scale_number, scale_number, other_type, other_type, other_type, word,
    word,
    word_of_file, word_of_file, unit, unit, rename_key, key_of_file, misspell_key, drop_block, repeat_block,
    move_block, header, nest,
    long_text, many_tables, formula, formula, spread, spread,
]  # fmt: skip
CSV_MUTATORS: list[Mutator] = [
    *ANY, csv_cell, csv_cell, csv_cell, csv_cell, csv_dialect, csv_quote, csv_ragged, csv_long, csv_many,
    scale_number, number,
]  # fmt: skip


def mutate(text: str, table: bool, rng: random.Random) -> tuple[bytes, str]:
    """Spoil a text by one kind of damage, sometimes by two or three; returns the bytes and what was done."""
    kinds = CSV_MUTATORS if table else TOML_MUTATORS
    done: list[str] = []
    raw: bytes = text.encode()
    for _ in range(rng.choice([1, 1, 1, 1, 2, 3])):
        mutator = rng.choice(kinds)
        new = mutator(raw.decode("utf-8", "replace"), rng) if raw else b""
        raw = new.encode("utf-8", "surrogatepass") if isinstance(new, str) else new
        done.append(mutator.__name__)
        if len(raw) > 2_000_000:
            break
    return raw, " + ".join(done)
