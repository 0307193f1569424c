"""Loaded inputs as a notebook shows them: a parameter set and a study. The data classes below stay free of display."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import pandas

    from benchmark.sets.library import Library
    from benchmark.sets.parameters import ParameterSet
    from benchmark.sets.sources import Source
    from benchmark.sets.study import Study

__all__ = ["SetView", "StudyView"]


@dataclass(frozen=True, eq=False, repr=False)
class SetView:
    """One technology or wires set.

    Attributes
    ----------
    parameters : ParameterSet
        The set in SI, by node, with provenance.
    sources : mapping
        Every known source by key.
    """

    parameters: ParameterSet
    sources: Mapping[str, Source]

    @property
    def id(self) -> str:
        """Return the id of the set."""
        return self.parameters.id

    @property
    def title(self) -> str:
        """Return the title of the set."""
        return self.parameters.title

    @property
    def nodes(self) -> tuple[str, ...]:
        """Return the node labels in order."""
        return self.parameters.nodes

    @cached_property
    def frame(self) -> pandas.DataFrame:
        """Return one row per value and node, with unit, range, evidence, source and place.

        ``value``, ``low`` and ``high`` are in the unit of the column ``unit``, ``value_SI`` in its SI unit.
        """
        from benchmark.api.frames import set_frame

        return set_frame(self.parameters, self.sources)

    def __repr__(self) -> str:
        item = self.parameters
        kind = item.model or item.kind
        return f"SetView({item.id}: {kind}, node {', '.join(item.nodes)}, {len(item.values)} values)"

    def _repr_html_(self) -> str:
        from benchmark.api.display import set_html

        return set_html(self.parameters, self.sources)


@dataclass(frozen=True, eq=False, repr=False)
class StudyView:
    """A checked study with everything it refers to.

    Attributes
    ----------
    path : Path
        The study file.
    nodes : tuple of Path
        Further folders of sets it was loaded with.
    what_if : mapping
        Numbers used instead of those of the files, as text.
    study : Study
        The study in SI.
    library : Library
        Where its sets were found, with all sources and warnings.
    """

    path: Path
    nodes: tuple[Path, ...]
    what_if: Mapping[str, str]
    study: Study
    library: Library

    @property
    def id(self) -> str:
        """Return the id of the study."""
        return self.study.id

    @property
    def title(self) -> str:
        """Return the question in one line."""
        return self.study.title

    @property
    def sets(self) -> dict[str, SetView]:
        """Return every technology and wires set the study uses by id, candidate first."""
        from benchmark.record.ledger import technologies

        found = [*technologies(self.study), *self.study.wires_sets]
        return {item.id: SetView(item, self.library.sources) for item in found}

    @property
    def warnings(self) -> tuple[str, ...]:
        """Return what the check says loudly without refusing."""
        return tuple(str(warning) for warning in sorted(set(self.library.collector.warnings)))

    def __repr__(self) -> str:
        rivals = len(self.study.contenders)
        changed = "".join(f", what-if {name} = {value}" for name, value in self.what_if.items())
        against = f"{self.study.candidate.id} against {rivals} contender{'s' if rivals > 1 else ''}"
        return f"StudyView({self.id}: {against}, headline {self.study.headline}{changed})"

    def _repr_html_(self) -> str:
        from benchmark.api.display import study_html

        return study_html(self.study, self.what_if)
