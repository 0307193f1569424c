"""What changed between two states of a study, and why (layer 8)."""

from __future__ import annotations

from benchmark.record.changes.compare import (
    QuestionsDiffer,
    compare_sets,
    compare_states,
    in_record,
    refuse_other_question,
)
from benchmark.record.changes.states import State, open_state, read_any_record, set_state

__all__ = [
    "QuestionsDiffer",
    "State",
    "compare_sets",
    "compare_states",
    "in_record",
    "open_state",
    "read_any_record",
    "refuse_other_question",
    "set_state",
]
