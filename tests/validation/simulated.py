"""What ngspice found for the open cards, stored: ``tests/data/simulated-open-cards.csv``.

The page is made without ngspice, so the three functions of ``tests/open_cards/freepdk45.py`` that simulate are answered
from the file, by their arguments. The comparisons themselves run as they are. ``measure`` writes the file anew, and a
test simulates some of its lines again.
"""

from __future__ import annotations

import contextlib
import csv
import functools
import inspect
import json
import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np

from tests.open_cards import freepdk45
from tests.open_cards.card import Chain
from tests.open_cards.fit import Capacitance, Curves

__all__ = ["FUNCTIONS", "PATH", "answered", "arguments", "measure", "numbers", "stored"]

PATH = Path(__file__).parent.parent / "data" / "simulated-open-cards.csv"
FUNCTIONS: dict[str, Callable[..., Any]] = {
    name: getattr(freepdk45, name) for name in ("curves", "capacitance", "measured_chain")
}
COLUMNS = ("function", "arguments", "part", "values", "source")
SOURCE = "own simulation, ngspice 39.3, open 45 nm cards (package c4m-pdk-freepdk45 0.0.1), 27 degC; SI"
Parts = dict[str, tuple[float, ...]]


def arguments(name: str, *args: Any, **kwargs: Any) -> str:
    """Write the arguments of a call, defaults included, as one text."""
    bound = inspect.signature(FUNCTIONS[name]).bind(*args, **kwargs)
    bound.apply_defaults()
    return json.dumps(bound.arguments)


def numbers(result: Any) -> Parts:
    """Take a result apart into named numbers."""
    if isinstance(result, dict):
        return {
            f"{polarity}.{field}": tuple(getattr(known, field).tolist())
            for polarity, known in result.items()
            for field in ("supplies", "on", "off", "effective")
        }
    fields = vars(result)
    return {name: (float(value),) for name, value in fields.items()}


def _result(name: str, parts: Parts) -> Any:
    if name == "curves":
        fields = ("supplies", "on", "off", "effective")
        return {p: Curves(*(np.array(parts[f"{p}.{field}"]) for field in fields)) for p in ("n", "p")}
    made = Capacitance if name == "capacitance" else Chain
    return made(**{field: values[0] for field, values in parts.items()})


@functools.lru_cache(maxsize=1)
def stored() -> dict[tuple[str, str], Parts]:
    """Read the file: function and arguments -> parts."""
    found: dict[tuple[str, str], Parts] = {}
    with PATH.open(newline="", encoding="utf-8") as stream:
        for row in csv.DictReader(stream):
            parts = found.setdefault((row["function"], row["arguments"]), {})
            parts[row["part"]] = tuple(float(word) for word in row["values"].split())
    return found


def _modules() -> list[Any]:
    return [module for name, module in sys.modules.items() if name.startswith("tests.open_cards.") and module]


def _forget() -> None:
    """Empty what the comparisons remember, so that stored and fresh numbers never meet."""
    for module in _modules():
        for item in vars(module).values():
            if hasattr(item, "cache_clear") and getattr(item, "__module__", "") == module.__name__:
                item.cache_clear()


@contextlib.contextmanager
def _put(functions: dict[str, Callable[..., Any]]) -> Iterator[None]:
    """Put functions in place of those that simulate, wherever they were imported."""
    places = [(m, n) for m in _modules() for n in FUNCTIONS if vars(m).get(n) is FUNCTIONS[n]]
    _forget()
    for module, name in places:
        setattr(module, name, functions[name])
    try:
        yield
    finally:
        for module, name in places:
            setattr(module, name, FUNCTIONS[name])
        _forget()


def answered() -> contextlib.AbstractContextManager[None]:
    """Answer from the file inside the block.

    Raises
    ------
    KeyError
        By a call inside the block that is not in the file.
    """

    def answer(name: str, *args: Any, **kwargs: Any) -> Any:
        key = (name, arguments(name, *args, **kwargs))
        if key not in stored():
            message = f"{PATH.name} has no {name} of {key[1]}: run tests/remake_validation.py --simulate"
            raise KeyError(message)
        return _result(name, stored()[key])

    return _put({name: functools.partial(answer, name) for name in FUNCTIONS})


def measure(run: Callable[[], object]) -> None:
    """Run something, keep every simulation it asked for and write the file."""
    found: dict[tuple[str, str], Parts] = {}

    def record(name: str, *args: Any, **kwargs: Any) -> Any:
        result = FUNCTIONS[name](*args, **kwargs)
        found[name, arguments(name, *args, **kwargs)] = numbers(result)
        return result

    with _put({name: functools.partial(record, name) for name in FUNCTIONS}):
        run()
    with PATH.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(COLUMNS)
        for (name, text), parts in sorted(found.items()):
            for part, values in parts.items():
                writer.writerow((name, text, part, " ".join(f"{value:.8g}" for value in values), SOURCE))
    stored.cache_clear()
