"""What holds at a place while its plan is judged: the keys of its opening, or else those of its side."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from tidescour.plan.draft import Draft
from tidescour.plan.kinds import SIDES, Side
from tidescour.plan.openings import written_names
from tidescour.plan.problems import KeyPath


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DraftPlace:
    """A place of a draft; `tables` are the paths of those tables of `[protection]` that tell of it, nearest first."""

    opening: str
    side: Side
    tables: tuple[KeyPath, ...]

    def given(self, draft: Draft, key: str) -> tuple[KeyPath, Any]:
        """Return the table that gives a key to this place, and what it gives; an empty path and None where none."""
        path = next((path for path in self.tables if draft.has(*path, key)), ())
        return path, getattr(draft.parts[path], key) if path else None


def draft_places(draft: Draft, *keys: str) -> Iterator[DraftPlace]:
    """Return every place at which these keys are sound; while there are no stages, the sides stand for theirs."""
    for side in SIDES:
        for name in dict.fromkeys(written_names(draft.written, "stage")) or ("",):
            around: KeyPath = ("protection", side)
            tables = tuple(path for path in ((*around, "opening", name), around) if path in draft.parts)
            if all(draft.is_sound(path, key) for path in tables for key in keys):
                yield DraftPlace(opening=name, side=side, tables=tables)
