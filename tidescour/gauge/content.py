"""From the bytes of a file to its text: packing, encoding, NUL bytes."""

from __future__ import annotations

import gzip
import io
import zlib
from dataclasses import dataclass
from typing import Final

from tidescour.errors import Finding, RecordError

GZIP_MAGIC: Final = b"\x1f\x8b"
ZIP_MAGIC: Final = b"PK\x03\x04"
LARGEST_UNPACKED: Final = 1 << 30
"""Bytes; a packed file that grows beyond is no gauge record."""


@dataclass(frozen=True, slots=True, kw_only=True)
class FileText:
    """Text of a file, lines ended by a newline, and what was put right to get it."""

    text: str
    findings: tuple[Finding, ...] = ()


def file_text(content: bytes, where: str) -> FileText:
    """Text in the bytes of a file, packed or not.

    Parameters
    ----------
    content : bytes
        The file as it lies on disk; gzip is recognised by its first bytes, not by its name.
    where : str
        Name for messages.

    Returns
    -------
    FileText
        Lines ended by a newline, no byte order mark.

    Raises
    ------
    RecordError
        If the file is empty, packed but truncated or damaged, a zip archive, or holds NUL bytes inside its text.
    """
    plain = _unpacked(content, where)
    if not plain.strip(b"\0\r\n\t \x1a"):
        raise RecordError(f"{where}: the file is empty; give one that holds a record")
    text, notes = _decoded(plain, where)
    body = text.rstrip("\0\x1a")
    if len(body) < len(text):
        cut = len(text) - len(body)
        notes.append(_note(where, "nul-tail", f"{cut} NUL or end-of-file characters after the last row were cut"))
    if "\0" in body:
        line = body.count("\n", 0, body.index("\0")) + 1
        raise RecordError(
            f"{where} line {line}: a NUL byte inside the text; the logger or the transfer damaged the file, or it is "
            "UTF-16 without a byte order mark; export it again as UTF-8"
        )
    return FileText(text=body.replace("\r\n", "\n").replace("\r", "\n"), findings=tuple(notes))


def _unpacked(content: bytes, where: str) -> bytes:
    if content.startswith(ZIP_MAGIC):
        raise RecordError(f"{where}: a zip archive or a spreadsheet; unpack it, or save the sheet as CSV")
    if not content.startswith(GZIP_MAGIC):
        return content
    try:
        with gzip.GzipFile(fileobj=io.BytesIO(content)) as packed:
            plain = packed.read(LARGEST_UNPACKED + 1)
    except (EOFError, OSError, zlib.error) as fault:
        raise RecordError(f"{where}: a gzip file that is truncated or damaged ({fault}); copy it again") from fault
    if len(plain) > LARGEST_UNPACKED:
        raise RecordError(f"{where}: unpacks to more than {LARGEST_UNPACKED >> 30} GiB; no gauge record is that large")
    return plain


def _decoded(plain: bytes, where: str) -> tuple[str, list[Finding]]:
    if plain.startswith((b"\xff\xfe", b"\xfe\xff")):
        try:
            return plain.decode("utf-16"), [_note(where, "encoding", "read as UTF-16")]
        except UnicodeDecodeError as fault:
            raise RecordError(f"{where}: begins as UTF-16 but is not ({fault.reason}); export it as UTF-8") from fault
    try:
        return plain.decode("utf-8-sig"), []
    except UnicodeDecodeError:
        pass
    try:
        return plain.decode("cp1252"), [_note(where, "encoding", "not UTF-8, read as Windows-1252")]
    except UnicodeDecodeError as fault:
        line = plain.count(b"\n", 0, fault.start) + 1
        raise RecordError(f"{where} line {line}: neither UTF-8 nor Windows-1252; export it as UTF-8") from fault


def _note(where: str, code: str, message: str) -> Finding:
    return Finding(severity="note", code=code, where=where, message=message)
