"""Whether tables of one kind have names of their own."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from tidescour.plan.problems import KeyPath, Problem


def same_names(names: Iterable[tuple[KeyPath, str]], word: str) -> Iterator[Problem]:
    """Return a problem for each table whose name stands further up too; `word` says what such a table is."""
    seen: set[str] = set()
    for path, name in names:
        if name in seen:
            yield Problem(path=(*path, "name"), message=f"stands twice; every {word} needs a name of its own")
        seen.add(name)
