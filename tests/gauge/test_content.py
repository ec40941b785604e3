"""From bytes to text."""

import gzip

import pytest

from tidescour.errors import RecordError
from tidescour.gauge.content import file_text

TEXT = "time,level_m\n2026-01-01T00:00Z,1.0\n2026-01-01T00:10Z,1.1\n"


@pytest.mark.parametrize(
    "content",
    [
        TEXT.encode(),
        b"\xef\xbb\xbf" + TEXT.encode(),
        TEXT.replace("\n", "\r\n").encode(),
        TEXT.replace("\n", "\r").encode(),
        gzip.compress(TEXT.encode(), mtime=0),
    ],
    ids=["plain", "byte order mark", "CRLF", "CR", "gzip"],
)
def test_the_same_text_comes_out_of_every_usual_wrapping(content):
    found = file_text(content, "sea.csv")
    assert found.text == TEXT
    assert found.findings == ()


@pytest.mark.parametrize("codec", ["utf-16", "utf-16-le", "utf-16-be"])
def test_utf16_with_a_mark_is_read_with_a_note(codec):
    marks = {"utf-16": b"", "utf-16-le": b"\xff\xfe", "utf-16-be": b"\xfe\xff"}
    found = file_text(marks[codec] + TEXT.encode(codec), "sea.csv")
    assert found.text == TEXT
    assert [finding.code for finding in found.findings] == ["encoding"]


def test_windows_1252_in_a_header_is_read_with_a_note():
    found = file_text("höhe °\n1\n".encode("cp1252"), "sea.csv")
    assert found.text == "höhe °\n1\n"
    assert found.findings[0].code == "encoding"


def test_a_tail_of_nul_bytes_is_cut_with_a_note():
    found = file_text(TEXT.encode() + b"\0" * 100, "sea.csv")
    assert found.text == TEXT
    assert found.findings[0].code == "nul-tail"
    assert "100" in found.findings[0].message


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "empty"),
        (b"\r\n \0\0", "empty"),
        (TEXT.encode().replace(b"00:10", b"00\0:10"), "line 3: a NUL byte"),
        (TEXT.encode("utf-16-le"), "NUL byte"),
        (gzip.compress(TEXT.encode(), mtime=0)[:-9], "truncated"),
        (gzip.compress(TEXT.encode(), mtime=0)[:-6] + b"abcdef", "damaged"),
        (b"PK\x03\x04rest", "zip archive or a spreadsheet"),
        (b"\xff\xfea", "begins as UTF-16"),
        (b"time\n\x81\xff\n", "line 2: neither UTF-8"),
    ],
)
def test_unreadable_bytes_are_refused(content, message):
    with pytest.raises(RecordError, match=message):
        file_text(content, "sea.csv")
