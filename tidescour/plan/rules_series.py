"""Whether a series that a plan names is there, and of the quantity that is needed."""

from __future__ import annotations

from collections.abc import Iterator

from tidescour.plan.draft import Draft
from tidescour.plan.models import Quantity, Series
from tidescour.plan.problems import KeyPath, Problem, found, key_text, suggestion


def series_problems(
    draft: Draft, path: KeyPath, name: str, quantity: Quantity, words: tuple[str, ...] = ()
) -> Iterator[Problem]:
    """Return what is wrong with a named series; nothing where it is written but its quantity is not sound."""
    quantities = {str(other): series.quantity for (_, other), series in draft.each_with(Series, "quantity")}
    if quantities.get(name, quantity) != quantity:
        yield Problem(path=path, message=f'found "{name}", a series of {quantities[name]}; needs one of {quantity}')
    elif not draft.has("series", name):
        choices = [*words, *(other for other, kind in quantities.items() if kind == quantity)]
        table = key_text(("series", name), {})
        message = f"found {found(name)}, but there is no [{table}]; {suggestion(name, choices)}"
        yield Problem(path=path, message=message)
