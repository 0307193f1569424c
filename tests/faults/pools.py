"""What is put into files to spoil them: numbers, words, units, letters, bytes, formulas, headers, cells."""

from __future__ import annotations

#: spellings of numbers, many of them no number of the program
NUMBERS = [
    "nan", "+nan", "-nan", "inf", "-inf", "0", "-0.0", "1", "-1", "2", "1e300", "-1e300", "1e-300", "1.1e300",
    "1e308", "1e400", "-1e400", "1e-400", "1e999999999", "1e-999999999", "0.1", "3", "7", "1e6", "1e9", "1e12",
    "1e15", "1e18", "1e21", "1e24", "1e-6", "1e-9", "1e-12", "1e-15", "1e-18", "1e-21", "1e-24", "9007199254740993",
    "0x10", "0o17", "0b101", "1_000", "2.5", "0.5", "1.0", "-273.15", "-274", "-1e-9", "5e-324",
    "99999999999999999999", "1.7976931348623157e308", "0.1e-299", "9" * 400, "9" * 5000, "0." + "3" * 5000,
    "0x" + "f" * 6000, "-" + "1" * 300, "1e" + "9" * 40,
]  # fmt: skip

#: something else where a number, a word or a table is due
OTHER_TYPES = [
    "true", "false", "[]", "{}", "[1]", "[[]]", "[{}]", "{a=1}", "{value=1}", "{value=1,unit=\"V\"}", "2026-02-30",
    "2026-01-31", "07:32:00", "2026-01-31T07:32:00Z", "1979-05-27T00:32:00.999999-07:00", "''", "\"\"", "[nan]",
    "{a={a={a=1}}}", "[1,\"a\",true]", "None", "null", "1,2", "1.2.3", "-", ",",
]  # fmt: skip

#: letters and signs: marks of order and direction, look-alikes, control characters, escapes, signs of TOML
LETTERS = [
    "\ufeff", "\u202e", "\u200f", "\u200b", "\u2028", "\u2029", "\x85", "\x00", "\x0b", "\x0c", "\x1b[31m", "\x1c",
    "\x7f", "\r", "\t", "е", "о", "Α", "１", "٣", "µ", "μ", "Ω", "Ω", "́", "😀", "\U0010ffff", "\ue000", "\\u0000",
    "\\ud800", "\\U0010FFFF", "\\", "\"", "'", "#", "[", "]", "{", "}", "=", ".", ",", "\n", "\"\"\"", "'''", "%s",
    "{0}", "-",
]  # fmt: skip

#: bytes that are no UTF-8, surrogates among them
BYTES = [
    b"\xed\xa0\x80", b"\xff", b"\xfe\xff", b"\xc0\x80", b"\x80", b"\xf4\x90\x80\x80", b"\x00", b"\xe2\x82", b"\xf8",
]  # fmt: skip

#: words of the files at wrong places, paths, names with a meaning elsewhere
WORDS = [
    "n/a", "-", ".", "..", "../x", "../../etc/passwd", "/etc/passwd", "/dev/zero", "/dev/stdin", "CON", "nul", "a/b",
    "a\\\\b", "sources", "study", "default", "value", "self", "cycle", "contender:", "contender:relay", "none",
    "hard", "report", "invented", "measured", "derived", "assumed", "choice", "target", "published", "given", "table",
    "stress-gated", "virtual-source", "steep-swing", "stage-table", "own-best", "self-timed", "gated", "ungated",
    "transient", "integral", "step", "iso-delay", "same-supply", "minimum-energy", "random-logic", "ring", "g1", "g2",
    "g9", "n1", "w1", "wires", "lines", "switch", "mixed", "1e-9", "25", "nan", "__class__", "__init__",
    "{0.__class__}", "%n", "${HOME}", "~", "*", "?", "<script>", "<!--", "é", "\u202eevil", "tables/curve.csv",
    "curve.toml",
]  # fmt: skip

#: units, right ones at wrong places and wrong ones
UNITS = [
    "V", "mV", "kV", "MV", "V/m", "A", "uA", "A/um", "A/m", "mA/mm", "F", "fF", "aF", "fF/um", "F/m^2", "ohm", "kohm",
    "ohm*m", "ohm*um", "s", "ns", "ps", "fs", "year", "month", "Hz", "MHz", "m", "um", "nm", "m^2", "um^2", "K",
    "degC", "degF", "degR", "J", "fJ", "eV", "W", "nW", "W/cm^2", "1", "percent", "%", "dB", "decade", "mV/decade",
    "V/dec", "kg", "kg/m^3", "Pa", "GPa", "1/TPa", "pm/V", "C/N", "a", "c", "h", "u", "mil", "V^0", "V^999", "V^1e9",
    "1/0", "V**V", "2*V", "1e9*V", "1e400*V", "V+V", "(V", ")", "V;A", "delta_degC", "offset_degC", "µV", "μV", "ΩΩ",
    "Ω", "Ohm", "OHM", "fahrenheit", "cycles/s", "rad", "bit", "V/K/s/m/kg/A/cd/mol", "__import__('os')", "lambda:0",
    "[V]", "V.m", "pint.UnitRegistry()", "", " ", "V " * 50, "(" * 200 + "V" + ")" * 200, "V*" * 300 + "V",
    "V^(2^(2^(2^9)))", "9" * 4400, "1e999999999",
]  # fmt: skip

#: keys: of other tables, reserved, look-alikes
KEYS = [
    "value", "by_node", "unit", "spread", "evidence", "source", "where", "conditions", "note", "owner", "bound",
    "formula", "unusual", "date", "schema", "id", "title", "model", "nodes", "kind", "default", "option", "anchor",
    "table", "row", "valid", "low", "high", "shape", "factor", "ln_sd", "sd", "percent", "net", "layer", "workload",
    "contender", "__class__", "class", "self", "0", "1", "-", "a.b", "value.value", "on_resistance", "onn_resistance",
    "\"\"", "\"a", "b\"", "\"\\u0000\"", "\"é\"", "е",
]  # fmt: skip

#: formulas of derived values
FORMULAS = [
    "a", "on_resistance", "on_resistance*1", "1e999", "-1e999", "10**400", "2.0**5000", "(-1)**0.5", "0/0", "1/0",
    "1/1e-320", "nan", "inf", "x", "__import__('os').system('true')", "(" * 150 + "1" + ")" * 150, "-" * 300 + "1",
    "1if 1else 2", "0x1for x in y", "1 is 1", "'a'*99", "[1]", "lambda: 0", "on_resistance**on_resistance**9",
    "9**9**9**9", "1e308*10", "1.e", "1_0", "０", "on_resistance+off_resistance", "ｏn_resistance", "\\u0000", "\\n",
    "True", "1j", "...", "a:=1", "{", "f''", "#", "*".join(["9"] * 150), "9" * 390, "1.0 " * 90,
    "off_resistance/declared_supply", "input_capacitance", "a if b else c", "yield 1", "1;2", "\\\\",
]  # fmt: skip

#: headers of tables
HEADERS = [
    "[value]", "[[value]]", "[value.value]", "[[value.on_resistance]]", "[net]", "[row]", "[contender]", "[default]",
    "[]", "[a", "a]", "[ value . x ]", "[value.\"a.b\"]", "[[net]]", "[[row]]", "[[contender]]", "[workload]",
    "[table.current]", "[anchor.on_current]", "[value.on_resistance.spread]", "[table." + "a" * 300 + "]",
    "[value.0]", "[option]", "[layer.upper]", "[candidate.knobs.supply]",
]  # fmt: skip

#: cells of a table
CELLS = [
    "", "   ", " ", "n/a", "1,2e-9", "\"1\"", "'1'", "1e-9V", "٣", "１", "1_0", "−1", "1e", "e5", "+", "forward",
    "=1+1", "\"\"", "\"",
]  # fmt: skip
