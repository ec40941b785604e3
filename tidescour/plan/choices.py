"""What the tables of later steps offer, handed to the plan check so that it need not look ahead."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from tidescour.table import Parameter


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Choices:
    """Names that a plan may use, as the tables have them.

    Parameters
    ----------
    layouts, shields, profiles, spreadings, laws, constituents : tuple of str
        Allowed names.
    relations : mapping of str to tuple of Parameter
        Allowed relations, each with the numbers that an opening gives beside it.
    """

    layouts: tuple[str, ...]
    shields: tuple[str, ...]
    profiles: tuple[str, ...]
    spreadings: tuple[str, ...]
    laws: tuple[str, ...]
    constituents: tuple[str, ...]
    relations: Mapping[str, tuple[Parameter, ...]]
