"""Ends of line, byte order marks and encodings, wherever the blocks of bytes are cut."""

import numpy as np
import pytest
from pydantic import ValidationError

from profiles.errors import DataError
from profiles.ingest import read, source
from profiles.ingest.layout import WideLayout
from profiles.ingest.lines import begin_with, find_lines

HEAD, ROWS = "date,T_1m", [f"2031-01-{day:02},{day}" for day in range(1, 8)]


def spans(content):
    starts, ends = find_lines(np.frombuffer(content, np.uint8))
    return [content[start:end] for start, end in zip(starts, ends, strict=True)]


@pytest.mark.parametrize(
    ("content", "lines"),
    [
        (b"", []),
        (b"a", [b"a"]),
        (b"a\n", [b"a"]),
        (b"a\r", [b"a"]),
        (b"a\r\nb", [b"a", b"b"]),
        (b"a\rb\nc\r\n\r\n", [b"a", b"b", b"c", b""]),
        (b"\n\r\r\n", [b"", b"", b""]),
        (b"a\x0bb\x0cc\n", [b"a\x0bb\x0cc"]),
    ],
)
def test_lines_end_with_a_feed_a_return_or_both(content, lines):
    assert spans(content) == lines


def test_lines_are_told_by_what_they_begin_with_after_blanks():
    content = b"# a\n \t# b\n#\n\n  \nx # c\n"
    buffer = np.frombuffer(content, np.uint8)
    starts, ends = find_lines(buffer)
    comment = begin_with(buffer, starts, ends, np.frombuffer(b"#", np.uint8))
    np.testing.assert_array_equal(comment, [True, True, True, False, False, False])
    blank = begin_with(buffer, starts, ends, np.frombuffer(b"", np.uint8))
    np.testing.assert_array_equal(blank, [False, False, False, True, True, False])


@pytest.mark.parametrize("ends", ["\n", "\r", "\r\n", ("\r\n", "\n", "\r", "\r\n\r\n", "\n\n"), ("\r", "\r\n")])
@pytest.mark.parametrize("last", [True, False])
def test_any_end_of_line_is_read_whatever_the_blocks(write, wide, monkeypatch, ends, last):
    ends = [ends] if isinstance(ends, str) else list(ends)
    lines = [HEAD, *ROWS[:3], "2031-01-04", *ROWS[4:]]
    content = "".join(line + ends[place % len(ends)] for place, line in enumerate(lines))
    path = write(content if last else content.rstrip("\r\n"))
    number = 1 + sum(max(ends[place % len(ends)].count(mark) for mark in "\r\n") for place in range(4))
    for size in (*range(1, 30), 4096):
        monkeypatch.setattr(source, "BLOCK_BYTES", size)
        delivery = read(path, wide)
        assert (delivery.rows_read, delivery.rows_kept) == (7, 6)
        np.testing.assert_array_equal(delivery.chain["temperature"][:, 0], [1, 2, 3, 5, 6, 7])
        entry = delivery.quarantine.iloc[0]
        assert (entry["line"], entry["text"]) == (number, "2031-01-04")


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "utf-16-le", "utf-32", "cp1252", "shift_jis", "utf-7"])
def test_other_encodings_are_read_whatever_the_blocks(write, wide, monkeypatch, encoding):
    layout = WideLayout.model_validate(
        wide.model_dump() | {"encoding": encoding, "comment": "§" if encoding != "utf-7" else "#", "missing": ["x"]}
    )
    text = "\r\n".join([layout.comment + " note", "date,T_1m", "2031-01-01,20", layout.comment, "2031-01-02,x", ""])
    path = write(text.encode(encoding))
    for size in (4, 5, 7, 64):
        monkeypatch.setattr(source, "BLOCK_BYTES", size)
        delivery = read(path, layout)
        assert (delivery.rows_read, delivery.rows_quarantined) == (2, 0)
        np.testing.assert_array_equal(delivery.chain["temperature"][:, 0], [20, np.nan])


def test_a_byte_order_mark_in_the_middle_is_part_of_its_row(write, wide):
    delivery = read(write("﻿date,T_1m\n2031-01-01,20\n﻿2031-01-02,21\n"), wide)
    assert delivery.quarantine["line"].tolist() == [3]
    assert delivery.quarantine["reason"].tolist() == ["the time cannot be read"]


def test_bytes_of_another_encoding_spoil_their_row_alone(write, wide):
    delivery = read(write("date,T_1m\n2031-01-01,20\n2031-01-02,2ß\n".encode("latin-1")), wide)
    assert delivery.quarantine["reason"].tolist() == ["the row holds bytes that are not utf-8-sig"]


def test_text_in_utf_16_that_was_cut_inside_a_character_is_told(write, wide):
    layout = wide.model_copy(update={"encoding": "utf-16"})
    with pytest.raises(DataError, match="not in the layout's encoding"):
        read(write("date,T_1m\n2031-01-01,20\n".encode("utf-16")[:-1]), layout)


@pytest.mark.parametrize("encoding", ["hex", "rot13", "zip", "no-such"])
def test_what_is_no_encoding_of_text_is_refused(wide, encoding):
    with pytest.raises(ValidationError, match="no such encoding"):
        WideLayout.model_validate(wide.model_dump() | {"encoding": encoding})


@pytest.mark.parametrize("change", [{"comment": "…"}, {"missing": ["…"]}])
def test_a_text_that_the_encoding_does_not_have_is_refused(wide, change):
    with pytest.raises(ValidationError, match="cannot stand in a file that is written in iso8859-1"):
        WideLayout.model_validate(wide.model_dump() | {"encoding": "latin-1"} | change)


def test_a_line_longer_than_any_row_is_told_and_a_long_one_is_quarantined(write, wide, monkeypatch):
    path = write(f"{HEAD}\n{ROWS[0]}\n{'9' * 1_000_000}\n{ROWS[1]},{'1' * 400_000}\n{ROWS[2]}\n")
    delivery = read(path, wide)
    assert delivery.quarantine["line"].tolist() == [3, 4]
    assert delivery.quarantine["text"].str.len().max() == 200
    monkeypatch.setattr(source, "BLOCK_BYTES", 1000)
    monkeypatch.setattr(source, "LONGEST_LINE", 5000)
    with pytest.raises(DataError, match="a line is longer than any row"):
        read(path, wide)
