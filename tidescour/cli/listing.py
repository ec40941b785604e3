"""`tidescour layouts`, `relations` and `formulas`: what stands in the tables, with range, source and how sure."""

from __future__ import annotations

import json
import math
import textwrap
from collections.abc import Iterable
from typing import Any

import click

from tidescour.cli.options import json_option
from tidescour.cli.speaking import line_width


@click.command(short_help="List the layouts of gauge files.")
@json_option
def layouts(as_json: bool) -> None:
    """List the file layouts that gauge records may have."""
    from tidescour.gauge.layouts import LAYOUTS

    _show(LAYOUTS.values(), as_json)


@click.command(short_help="List the discharge relations.")
@json_option
def relations(as_json: bool) -> None:
    """List the discharge relations of openings, with the numbers that each asks for."""
    from tidescour.gap.relations import RELATIONS

    _show(RELATIONS.values(), as_json)


@click.command(short_help="List the methods and their sources.")
@click.argument("name", required=False)
@json_option
def formulas(name: str | None, as_json: bool) -> None:
    """List the methods, or one of them by NAME, each with its range, its source and how sure it is."""
    from tidescour.pipeline import method_entries

    entries = {entry.name: entry for entry in method_entries()}
    if name is not None and name not in entries:
        raise click.BadParameter(f"{name!r} is not among {', '.join(entries)}", param_hint="NAME")
    _show(entries.values() if name is None else [entries[name]], as_json)


def _show(entries: Iterable[Any], as_json: bool) -> None:
    if as_json:
        click.echo(json.dumps([_document(entry) for entry in entries], indent=2, ensure_ascii=False))
        return
    click.echo("\n\n".join(_text(entry) for entry in entries))


def _document(entry: Any) -> dict[str, Any]:
    return {
        "name": entry.name,
        "title": entry.title,
        "parameters": [
            {
                "name": p.name,
                "unit": p.unit,
                "over": p.low,
                "at_most": p.high,
                "needed": p.default is None,
                "default": p.default if p.default is not None and math.isfinite(p.default) else None,
                "together_with": p.together or None,
                "meaning": p.meaning,
            }
            for p in entry.parameters
        ],
        "validity": entry.validity,
        "source": entry.source,
        "confidence": entry.confidence,
    }


def _optional(parameter: Any) -> str:
    """Return what holds where a number is left out, and what it must stand beside."""
    if parameter.default is None:
        return ""
    words = f", {parameter.default:g} where left out" if math.isfinite(parameter.default) else ", may be left out"
    return words + (f", with {parameter.together}" if parameter.together else "")


def _text(entry: Any) -> str:
    lines = [f"{entry.name}: {entry.title}"]
    lines += [f"{p.name} [{p.unit}], over {p.low:g} to {p.high:g}{_optional(p)}: {p.meaning}" for p in entry.parameters]
    lines += [f"range: {entry.validity}", f"source: {entry.source}", f"how sure: {entry.confidence}"]
    wrapped = [textwrap.fill(lines[0], line_width(), subsequent_indent="  ")]
    wrapped += [textwrap.fill(line, line_width(), initial_indent="  ", subsequent_indent="    ") for line in lines[1:]]
    return "\n".join(wrapped)
