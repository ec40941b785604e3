"""A plan on its way: what was written, and what of its tables is sound in itself."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, TypeVar

from tidescour.plan.choices import Choices
from tidescour.plan.kinds import PlanModel
from tidescour.plan.problems import KeyPath, existing

Part = TypeVar("Part", bound=PlanModel)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Draft:
    """Parts of a plan, for rules that need more than one key.

    Parameters
    ----------
    written : mapping
        The tables as they stand in the file, sound or not; stages from a programme table too.
    parts : mapping of path to model
        The tables, in the order of the file. A stage stands as its `StageSpan`, each opening and each place that
        differs apart, so that one fault hides no other.
    faulty : mapping of path to set of str
        Keys that are missing or not within their own limits, by table, under their names in the model; the part of
        such a table was made without them. Tables without a fault are not in it.
    choices : Choices
        Names that a plan may use.
    """

    written: Mapping[str, Any]
    parts: Mapping[KeyPath, PlanModel]
    faulty: Mapping[KeyPath, frozenset[str]]
    choices: Choices

    def has(self, *path: str | int) -> bool:
        """Tell whether a table or a key is written, sound or not."""
        return existing(path, self.written) == path

    def part(self, model: type[Part], *path: str | int) -> Part | None:
        """Return a table where it is written and sound."""
        part = self.parts.get(path)
        return part if isinstance(part, model) and path not in self.faulty else None

    def each(self, model: type[Part]) -> Iterator[tuple[KeyPath, Part]]:
        """Return every sound table of one kind with its path."""
        return (item for item in self.each_with(model) if item[0] not in self.faulty)

    def each_with(self, model: type[Part], *keys: str) -> Iterator[tuple[KeyPath, Part]]:
        """Return every table of one kind in which these keys are sound, whatever its other keys are."""
        for path, part in self.parts.items():
            if isinstance(part, model) and all(self.is_sound(path, key) for key in keys):
                yield path, part

    def is_sound(self, path: KeyPath, key: str) -> bool:
        """Tell whether a key of a table is within its own limits, or not written and not needed."""
        return path in self.parts and key not in self.faulty.get(path, ())
