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
from tidescour.table import Entry

if TYPE_CHECKING:
    from tidescour.handoff.not_in_it import LeftOut
    from tidescour.handoff.read import ReadRun

    Listed = Entry[Any] | LeftOut

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

    NAME is a method or the first word of some, the code of a finding (for the methods that it is about, or what it says
    is left out), or not-in-it (for what no method here holds).

    \b
    Examples:
      tidescour formulas alpha
      tidescour formulas izbash
      tidescour formulas swept-out-jump
      tidescour formulas --results mysite/plan_results
    """
    from tidescour.handoff.not_in_it import NOT_IN_IT
    from tidescour.handoff.read import read_run
    from tidescour.pipeline import method_entries

    entries = method_entries()
    run = None if results is None else read_run(results)
    if name is None:
        _show((entry for entry in entries if run is None or entry.name in run.methods), as_json, run)
    elif name == NOT_IN_IT_NAME:
        _show(NOT_IN_IT, as_json)
    else:
        found = _named((*entries, *NOT_IN_IT), name)
        _show(found, as_json, run, _code_lines(name, found, run))


def _named(listed: Sequence[Listed], name: str) -> tuple[Listed, ...]:
    """Return what has a name, or what a finding of this code is about, or what has the name as its first word.

    Nothing where the findings of the code are about none of these.
    """
    from tidescour.handoff.finding_codes import OTHER_FINDINGS, about

    found = (
        tuple(each for each in listed if name == each.name)
        or tuple(each for each in listed if name in _codes(each))
        or tuple(each for each in listed if each.name.startswith(f"{name}-"))
    )
    if found or about(name) is not None:
        return found
    known = dict.fromkeys(
        [
            *(each.name for each in listed),
            *(code for each in listed for code in _codes(each)),
            *(code for codes in OTHER_FINDINGS.values() for code in codes),
            NOT_IN_IT_NAME,
        ]
    )
    near = get_close_matches(name, known, n=3, cutoff=0.5)
    told = f"nearest: {', '.join(near)}" if near else "without a NAME all methods are listed, each with its name first"
    raise click.BadParameter(f"no method and no finding is called {name!r}; {told}", param_hint="NAME")


def _codes(each: Listed) -> tuple[str, ...]:
    """Return the codes of all findings that are about a method, or about something left out."""
    return (*each.left_by, *_codes_beside(each)) if isinstance(each, Entry) else _codes_beside(each)


def _codes_beside(each: Listed) -> tuple[str, ...]:
    """Return those of them that do not tell that the range of a method was left."""
    return each.leads_to if isinstance(each, Entry) else each.told_by


def _code_lines(name: str, found: Sequence[Listed], run: ReadRun | None) -> list[str]:
    """Return what the methods do not say of the code of a finding: that it is about none, and what a run found."""
    from tidescour.handoff.finding_codes import about

    subject = about(name)
    if subject is None and (run is None or not any(name in _codes_beside(each) for each in found)):
        return []
    told = "" if subject is None else f" about {subject}, not about a method: its message says all"
    here = () if run is None else [f"{each.where}: {each.message}" for each in run.findings if each.code == name]
    lines = [_line(f"this run: {text}") for text in here or ["no such finding"]] if run is not None else []
    return [_line(f"finding {name}:{told}", indent=0), *lines]


def _show(listed: Iterable[Listed], as_json: bool, run: ReadRun | None = None, last: Sequence[str] = ()) -> None:
    """Show methods and what is left out, a block each, and as text a last block of lines."""
    if as_json:
        documents = [{**_document(each), **_run_document(each, run)} for each in listed]
        click.echo(json.dumps(documents, indent=2, ensure_ascii=False))
        return
    blocks = ["\n".join([*_lines(each), *_run_lines(each, run)]) for each in listed]
    click.echo("\n\n".join([*blocks, "\n".join(last)] if last else blocks))


def _document(entry: Listed) -> dict[str, Any]:
    from tidescour.handoff.methods_table import symbol_objects
    from tidescour.handoff.not_in_it import left_out_object

    if not isinstance(entry, Entry):
        return left_out_object(entry)
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
        "findings": list(_codes(entry)),
    }


def _run_document(entry: Listed, run: ReadRun | None) -> dict[str, Any]:
    if run is None or not isinstance(entry, Entry):
        return {}
    return {"used": entry.name in run.methods, "left_range": list(_left(entry, run))}


def _run_lines(entry: Listed, run: ReadRun | None) -> list[str]:
    """Return what one run has to do with a method."""
    if run is None or not isinstance(entry, Entry):
        return []
    if entry.name not in run.methods:
        return [_line("this run: not used")]
    return [_line(f"this run: {text}") for text in _left(entry, run) or ["nothing found that leaves this range"]]


def _left(entry: Entry[Any], run: ReadRun) -> tuple[str, ...]:
    """Return where a run left the range of a method; a method that it did not use has none to leave."""
    from tidescour.handoff.methods_table import left_range

    return left_range(entry, run.findings) if entry.name in run.methods else ()


def _optional(parameter: Any) -> str:
    """Return what holds where a number is left out, and what it must stand beside."""
    if parameter.default is None:
        return ""
    words = f", {parameter.default:g} where left out" if math.isfinite(parameter.default) else ", may be left out"
    return words + (f", with {parameter.together}" if parameter.together else "")


def _lines(entry: Listed) -> list[str]:
    if not isinstance(entry, Entry):
        return _left_out_lines(entry)
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


def _left_out_lines(each: LeftOut) -> list[str]:
    return [
        _line(f"{each.name}: {each.what}", indent=0),
        _line(f"why it matters: {each.why}"),
        _line(f"which way leaving it out errs: {each.errs}"),
        _line(f"instead: {each.instead}"),
    ]
