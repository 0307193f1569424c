"""Every bound check row holds, and a 7 % error in any exercised function is noticed by some row."""

from __future__ import annotations

import dataclasses
import functools
import importlib
from collections import defaultdict
from collections.abc import Mapping
from typing import Any

import numpy as np
import pytest

from tests.published.rows import Binding, all_bindings, failures, load
from tests.published.unused import REASONS, reason

ROWS = load()
BINDINGS = all_bindings()


def test_every_binding_names_an_existing_row_once():
    names = [binding.row for binding in BINDINGS]
    assert set(names) <= set(ROWS)
    assert len(names) == len(set(names))


def test_every_other_row_says_why_nothing_answers_it():
    bound = {binding.row for binding in BINDINGS}
    assert [row for row in ROWS if row not in bound and not reason(row)] == []
    assert [start for start in REASONS if not any(row.startswith(start) for row in set(ROWS) - bound)] == []


@pytest.mark.parametrize("binding", BINDINGS, ids=lambda b: b.row)
def test_row_holds(binding: Binding):
    assert failures(binding, ROWS[binding.row]) == []


def _perturb(result: Any) -> Any:
    if isinstance(result, list):
        return [_perturb(item) for item in result]
    if isinstance(result, tuple):
        return tuple(_perturb(item) for item in result)
    if isinstance(result, Mapping):
        return {key: _perturb(item) for key, item in result.items()}
    if dataclasses.is_dataclass(result) and not isinstance(result, type):
        changed = {f.name: _perturb(getattr(result, f.name)) for f in dataclasses.fields(result) if f.init}
        return dataclasses.replace(result, **changed)
    if isinstance(result, bool) or (isinstance(result, np.ndarray) and result.dtype.kind not in "iufc"):
        return result
    if isinstance(result, (int, float, complex, np.ndarray, np.generic)):
        return result * 1.07
    return result


EXERCISED: dict[str, list[Binding]] = defaultdict(list)
for _binding in BINDINGS:
    for _name in _binding.exercises:
        EXERCISED[_name].append(_binding)


@pytest.mark.parametrize("name", sorted(EXERCISED))
def test_a_wrong_function_is_noticed(name: str, monkeypatch: pytest.MonkeyPatch):
    module_name, _, function_name = name.partition(":")
    module = importlib.import_module(module_name)
    original = getattr(module, function_name)

    @functools.wraps(original)
    def wrong(*args: Any, **kwargs: Any) -> Any:
        return _perturb(original(*args, **kwargs))

    monkeypatch.setattr(module, function_name, wrong)
    assert any(failures(binding, ROWS[binding.row]) for binding in EXERCISED[name])
