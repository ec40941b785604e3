"""A table of harmonic constants that stands instead of a sea record."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Collection
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path

from tidescour.errors import PlanError
from tidescour.plan.problems import found, suggestion
from tidescour.units import FloatArray, read_only

_COLUMNS = ("constituent", "amplitude_m", "phase_deg")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ConstantsTable:
    """Harmonic constants as a file gives them.

    Parameters
    ----------
    constituents : tuple of str
        Names, no two alike.
    amplitude_m : (n,) array
        Amplitudes [m], not negative.
    phase_deg : (n,) array
        Greenwich phase lags [degrees], as written.
    sha256 : str
        Of the file, in hexadecimal.
    """

    constituents: tuple[str, ...]
    amplitude_m: FloatArray
    phase_deg: FloatArray
    sha256: str

    def __post_init__(self) -> None:
        """Keep read-only copies; refuse arrays of another length."""
        object.__setattr__(self, "amplitude_m", read_only(self.amplitude_m))
        object.__setattr__(self, "phase_deg", read_only(self.phase_deg))
        if not self.amplitude_m.shape == self.phase_deg.shape == (len(self.constituents),):
            raise ValueError("constituents, amplitude_m and phase_deg must have one length")


def read_constants(path: Path, known: Collection[str] | None = None) -> ConstantsTable:
    """Read a CSV file with the columns ``constituent, amplitude_m, phase_deg``.

    Parameters
    ----------
    path : Path
        UTF-8, separated by commas, with a header; empty lines and lines that begin with ``#`` are passed over.
    known : collection of str, optional
        Constituents that the table may name; without it, any.

    Returns
    -------
    ConstantsTable
        In the order of the file.

    Raises
    ------
    PlanError
        With every problem by file and line: a column that is unknown, missing or double, a constituent that is
        unknown or stands twice, an amplitude that is negative, anything that is not a finite number.
    """
    try:
        content = path.read_bytes()
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise PlanError(f"{path}: is not UTF-8 text; save it as UTF-8") from None
    except OSError as error:
        raise PlanError(f"{path}: cannot be read: {error.strerror}; tide.sea_constants names it") from None
    except ValueError:  # of a name with a zero byte
        raise PlanError(f"{found(path.name)}: is no name of a file; tide.sea_constants has it") from None
    rows = [
        (number, [cell.strip() for cell in next(csv.reader(io.StringIO(line)))])
        for number, line in enumerate(text.splitlines(), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if len(rows) < 2:
        raise PlanError(f"{path}: needs a header {','.join(_COLUMNS)} and at least one row")
    (header_line, header), *body = rows
    if problems := _header_problems(header):
        raise PlanError(*(f"{path} line {header_line}: {problem}" for problem in problems))
    names: list[str] = []
    values: list[tuple[float, float]] = []
    wrong: list[str] = []
    for number, cells in body:
        row = dict(zip(header, cells, strict=False))
        problems = _row_problems(row, len(header), len(cells), names, known)
        wrong += [f"{path} line {number}: {problem}" for problem in problems]
        if not problems:
            names.append(row["constituent"])
            values.append((float(row["amplitude_m"]), float(row["phase_deg"])))
    if wrong:
        raise PlanError(*wrong)
    return ConstantsTable(
        constituents=tuple(names),
        amplitude_m=read_only([amplitude for amplitude, _ in values]),
        phase_deg=read_only([phase for _, phase in values]),
        sha256=sha256(content).hexdigest(),
    )


def _header_problems(header: list[str]) -> list[str]:
    unknown = [f"unknown column {found(name)}; {suggestion(name, _COLUMNS)}" for name in header if name not in _COLUMNS]
    missing = [f'has no column "{name}"' for name in _COLUMNS if name not in header]
    double = [f'two columns are named "{name}"' for name in _COLUMNS if header.count(name) > 1]
    return unknown + missing + double


def _row_problems(
    row: dict[str, str], columns: int, cells: int, names: list[str], known: Collection[str] | None
) -> list[str]:
    if cells != columns:
        return [f"has {cells} cells where the header has {columns}; write numbers with a decimal point"]
    problems = []
    if not row["constituent"]:
        problems.append("constituent is empty")
    elif known is not None and row["constituent"] not in known:
        problems.append(f"constituent: found {found(row['constituent'])}; {suggestion(row['constituent'], known)}")
    if row["constituent"] in names:
        problems.append(f'"{row["constituent"]}" stands twice')
    for key in ("amplitude_m", "phase_deg"):
        number = _number(row[key])
        if not math.isfinite(number):
            problems.append(f"{key}: found {found(row[key])}; needs a finite number")
        elif key == "amplitude_m" and number < 0.0:
            problems.append(f"{key}: found {number:g}; needs a number from 0 up")
    return problems


def _number(text: str) -> float:
    try:
        return float(text)
    except ValueError:
        return math.nan
