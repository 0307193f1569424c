"""Whatever is done to a value by edits, every state it had comes back as it was (all values invented)."""

from __future__ import annotations

import datetime
from decimal import Decimal as D
from pathlib import Path
from typing import Any

from hypothesis import given
from hypothesis import strategies as st

from benchmark.sets.edit import Edit, edited_text
from benchmark.sets.files import TomlFile, parse_toml
from benchmark.sets.history import as_it_was
from benchmark.sets.problems import Collector

FIRST = datetime.date(2026, 1, 1)
TEXT = """\
[default]
evidence = "invented"
source = "invented"
conditions = "as all others"

# about a
[value.a]
value = 1.0 # beside
unit = "V"
note = "first"

# about b
[value.b]
by_node = {{ g1 = 1.0, g2 = 2.0 }}
unit = "V"
spread = {{ shape = "normal", percent = 5 }}
bound = "at-most"
[value.c]
{c}
# the end
"""
LAYOUTS = ['value = 3.0\nunit = "V"', 'value = 3.0\nunit = "V"\n\n[value.c.spread]\nshape = "normal"\nsd = 0.1']
WORDS = st.sampled_from([None, "one", "two words", 'with "quotes" and \\ strokes', "µ Ω °"])
NUMBERS = st.decimals(min_value=D("0.001"), max_value=D("1000"), places=4)
CHANGES = st.fixed_dictionaries(
    {"number": NUMBERS},
    optional={
        "unit": st.sampled_from(["V", "mV"]),
        "spread": st.sampled_from([None, {"shape": "lognormal", "factor": D("1.2")}]),
        "evidence": st.sampled_from(["measured", "assumed"]),
        "source": st.sampled_from(["s1", "s2"]),
        "where": WORDS,
        "conditions": WORDS,
        "note": WORDS,
        "owner": WORDS,
        "bound": st.sampled_from([None, "at-least"]),
        "unusual": st.sampled_from([None, True]),
    },
)
EDITS = st.lists(st.tuples(st.sampled_from("abc"), CHANGES, st.booleans()), min_size=1, max_size=5)


def parsed(text: str) -> TomlFile:
    file = parse_toml(Path("s.toml"), text, "s.toml", Collector())
    assert file is not None
    return file


def state(file: TomlFile, name: str) -> dict[str, Any]:
    """What a value is: its table with the defaults of the file, without its history and its day."""
    defaults = file.data["default"]
    table = {key: item for key, item in file.data["value"][name].items() if key not in ("superseded", "date")}
    said = {key: table.get(key) or defaults.get(key) or "-" for key in ("evidence", "source", "where", "conditions")}
    return {**table, **said, "unusual": table.get("unusual", False)}


@given(edits=EDITS, layout=st.sampled_from(LAYOUTS), end=st.sampled_from(["\n", "\r\n"]))
def test_every_state_comes_back(edits: list[tuple[str, dict[str, Any], bool]], layout: str, end: str):
    text = TEXT.format(c=layout).replace("\n", end)
    states = {name: [(FIRST, state(parsed(text), name))] for name in "abc"}
    day = FIRST
    for name, change, by_node in edits:
        day += datetime.timedelta(days=2)
        file = parsed(text)
        number = change.pop("number")
        changed = {**change, "date": day, "value": number, "by_node": None}
        if by_node:
            changed |= {"value": None, "by_node": {"g1": number, "g2": number + 1}}
        collector = Collector()
        text = edited_text(file, [Edit(name, changed, "why", FIRST)], collector) or ""
        assert collector.problems == []
        states[name].append((day, state(parsed(text), name)))
    last = parsed(text)
    for name, history in states.items():
        for position, (start, then) in enumerate(history):
            until = history[position + 1][0] if position + 1 < len(history) else day
            for when in {start, until - datetime.timedelta(days=1)} if until > start else {start}:
                back = as_it_was(last, when, Collector())
                assert back is not None
                assert state(back, name) == then
    for comment in ("# about a", "# about b", "# beside", "# the end"):
        assert text.count(comment) == 1
    assert text.index("# about b") < text.index("[value.b]") - len("# about b")
    assert text.replace("\r\n", "\n").rstrip().endswith("# the end")
