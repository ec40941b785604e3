"""A plan on its way: what was written, and those of its tables that are sound in themselves."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, TypeVar

from tidescour.plan.choices import Choices
from tidescour.plan.models import PlanModel
from tidescour.plan.problems import KeyPath

Part = TypeVar("Part", bound=PlanModel)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Draft:
    """Parts of a plan, for rules that need more than one key.

    Parameters
    ----------
    written : mapping
        The tables as they stand in the file, sound or not; stages from a programme table too.
    parts : mapping of path to model
        Tables within their own limits, in the order of the file. A stage stands as its `StageSpan`, each opening and
        each place that differs apart, so that one fault hides no other.
    choices : Choices
        Names that a plan may use.
    """

    written: Mapping[str, Any]
    parts: Mapping[KeyPath, PlanModel]
    choices: Choices

    def has(self, *path: str) -> bool:
        """Tell whether a table is written, sound or not."""
        table: Any = self.written
        for key in path:
            if not isinstance(table, Mapping) or key not in table:
                return False
            table = table[key]
        return True

    def part(self, model: type[Part], *path: str | int) -> Part | None:
        """Return a table where it is written and sound."""
        part = self.parts.get(path)
        return part if isinstance(part, model) else None

    def broken(self, *path: str) -> bool:
        """Tell whether a table is written but not sound: what depends on it is then not judged."""
        return self.has(*path) and path not in self.parts

    def each(self, model: type[Part]) -> Iterator[tuple[KeyPath, Part]]:
        """Return every sound table of one kind with its path."""
        for path, part in self.parts.items():
            if isinstance(part, model):
                yield path, part
