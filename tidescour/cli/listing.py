"""`tidescour layouts`, `relations` and `formulas`: what stands in the tables, with range, source and how sure."""

from __future__ import annotations

import json
import math
import textwrap
from collections.abc import Iterable, Sequence
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from tidescour.cli.options import json_option
from tidescour.cli.speaking import line_width

if TYPE_CHECKING:
    from tidescour.handoff.read import ReadRun

NOT_IN_IT_NAME = "not-in-it"
NARROWEST_MEANING = 24


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
@click.option(
    "--results",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="Result folder of a run: only the methods that it used, and where it left their range.",
)
@json_option
def formulas(name: str | None, results: Path | None, as_json: bool) -> None:
    """List the methods, each with what it says, its symbols, its range, its source and how sure it is.

    NAME is a method, the code of a finding (for the methods that it qualifies), or not-in-it (for what no method here
    holds).

    \b
    Examples:
      tidescour formulas alpha
      tidescour formulas swept-out-jump
      tidescour formulas --results mysite/plan_results
    """
    if name == NOT_IN_IT_NAME:
        _show_not_in_it(as_json)
        return
    from tidescour.handoff.read import read_run
    from tidescour.pipeline import method_entries

    entries = method_entries()
    run = None if results is None else read_run(results)
    if name is not None:
        entries = _named(entries, name)
    elif run is not None:
        entries = tuple(entry for entry in entries if entry.name in run.methods)
    _show(entries, as_json, run)


def _named(entries: Sequence[Any], name: str) -> tuple[Any, ...]:
    """Return the method of a name, or those that a finding of this code qualifies."""
    found = tuple(entry for entry in entries if name == entry.name) or tuple(
        entry for entry in entries if name in entry.left_by
    )
    if found:
        return found
    names = [entry.name for entry in entries]
    known = dict.fromkeys([*names, *(code for entry in entries for code in entry.left_by), NOT_IN_IT_NAME])
    near = get_close_matches(name, known, n=3, cutoff=0.5)
    told = f"nearest: {', '.join(near)}" if near else f"it may be {', '.join(names)}"
    raise click.BadParameter(f"no method and no finding about one is called {name!r}; {told}", param_hint="NAME")


def _show(entries: Iterable[Any], as_json: bool, run: ReadRun | None = None) -> None:
    if as_json:
        documents = [{**_document(entry), **_run_document(entry, run)} for entry in entries]
        click.echo(json.dumps(documents, indent=2, ensure_ascii=False))
        return
    click.echo("\n\n".join("\n".join([*_lines(entry), *_run_lines(entry, run)]) for entry in entries))


def _document(entry: Any) -> dict[str, Any]:
    from tidescour.handoff.methods_table import symbol_objects

    return {
        "name": entry.name,
        "title": entry.title,
        "says": entry.says,
        "symbols": symbol_objects(entry),
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
        "findings": list(entry.left_by),
    }


def _run_document(entry: Any, run: ReadRun | None) -> dict[str, Any]:
    if run is None:
        return {}
    return {"used": entry.name in run.methods, "left_range": list(_left(entry, run))}


def _run_lines(entry: Any, run: ReadRun | None) -> list[str]:
    """Return what one run has to do with a method."""
    if run is None:
        return []
    if entry.name not in run.methods:
        return [_line("this run: not used")]
    return [_line(f"this run: {text}") for text in _left(entry, run) or ["nothing found that leaves this range"]]


def _left(entry: Any, run: ReadRun) -> tuple[str, ...]:
    """Return where a run left the range of a method; a method that it did not use has none to leave."""
    from tidescour.handoff.methods_table import left_range

    return left_range(entry, run.findings) if entry.name in run.methods else ()


def _optional(parameter: Any) -> str:
    """Return what holds where a number is left out, and what it must stand beside."""
    if parameter.default is None:
        return ""
    words = f", {parameter.default:g} where left out" if math.isfinite(parameter.default) else ", may be left out"
    return words + (f", with {parameter.together}" if parameter.together else "")


def _lines(entry: Any) -> list[str]:
    numbers = (
        f"{p.name} [{p.unit}], over {p.low:g} to {p.high:g}{_optional(p)}: {p.meaning}" for p in entry.parameters
    )
    return [
        _line(f"{entry.name}: {entry.title}", indent=0),
        *(_line(text) for text in entry.says.splitlines()),
        *_symbol_lines(entry.symbols),
        *(_line(text) for text in numbers),
        _line(f"range: {entry.validity}"),
        _line(f"source: {entry.source}"),
        _line(f"how sure: {entry.confidence}"),
    ]


def _symbol_lines(symbols: Sequence[Any]) -> list[str]:
    """Return the symbols as three columns; the meaning stands under the name where the terminal is narrow."""
    if not symbols:
        return []
    names, units = (max(map(len, column)) for column in zip(*((s.name, s.unit) for s in symbols), strict=True))
    heads = [f"    {s.name.ljust(names)}  {s.unit.ljust(units)}  " for s in symbols]
    hanging = len(heads[0])
    if line_width() - hanging < NARROWEST_MEANING:
        return [line for s in symbols for line in (f"    {s.name}  {s.unit}", _line(s.meaning, indent=6))]
    return [
        textwrap.fill(s.meaning, line_width(), initial_indent=head, subsequent_indent=" " * hanging)
        for s, head in zip(symbols, heads, strict=True)
    ]


def _line(text: str, indent: int = 2) -> str:
    """Return text in lines that fit the terminal, those after the first two columns further in."""
    return textwrap.fill(
        text,
        line_width(),
        initial_indent=" " * indent,
        subsequent_indent=" " * (indent + 2),
        break_on_hyphens=False,
    )


def _show_not_in_it(as_json: bool) -> None:
    from tidescour.handoff.not_in_it import NOT_IN_IT, not_in_it_objects

    if as_json:
        click.echo(json.dumps(not_in_it_objects(), indent=2, ensure_ascii=False))
        return
    click.echo(
        "\n\n".join(
            "\n".join(
                [
                    _line(f"{each.name}: {each.what}", indent=0),
                    _line(f"why it matters: {each.why}"),
                    _line(f"which way leaving it out errs: {each.errs}"),
                    _line(f"instead: {each.instead}"),
                ]
            )
            for each in NOT_IN_IT
        )
    )
