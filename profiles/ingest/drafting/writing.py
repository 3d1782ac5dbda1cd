"""A proposal as commented TOML."""

from __future__ import annotations

import json
import re
import textwrap
from collections.abc import Mapping, Sequence
from typing import Any

from profiles.ingest.drafting.proposal import Proposal

_WIDTH = 118
_BARE = re.compile(r"[A-Za-z0-9_-]+")

#: What each key says, in the order in which they are written.
_KEYS = {
    "kind": "How rows, times and depths go together.",
    "delimiter": 'What stands between cells; "whitespace" for any run of blanks.',
    "fixed": "First and last character of each column.",
    "trimmed": "Rows may end early, their last blanks cut away.",
    "comment": "Lines that begin with this are no data.",
    "header_rows": "Lines before the first row, comment and blank lines not counted.",
    "names_row": "Which of them holds the names of the columns.",
    "names": "Names of the columns, as the file has none that serve.",
    "encoding": "How letters are stored.",
    "member": "Which file of the archive, as a pattern.",
    "decimal": "Decimal mark.",
    "quoted": "Numbers stand in quotes, as the decimal mark is the delimiter too.",
    "missing": "Cells without a reading.",
    "ends_with_delimiter": "Rows, not names, end with one delimiter more.",
    "station": "Column that names the station.",
}
_TABLES = {
    "record": "The line before the readings of a profile: its cells, and which of them counts the readings.",
    "block": "How the header of a block is told, and what its rows hold beside the readings.",
    "time": "Where the stamps are, how they are written and what they stand for.",
    "depth": "How deep the sensors are.",
    "temperature": "Units and scale of the readings.",
    "quality": "What delivered quality marks mean: 1 good, 2 not evaluated, 3 questionable, 4 bad, 9 missing.",
    "variables": "Names of variables that the standard names in the file do not settle.",
}


def as_toml(proposal: Proposal, file_name: str) -> str:
    """Return a layout file with a comment on each key, what is unsure standing first."""
    content = proposal.content
    lines = [f"# Drafted from {printable(file_name)}. Look at every line before relying on it."]
    if proposal.doubts:
        lines += ["#", "# Unsure:"]
        for doubt in proposal.doubts:
            lines += textwrap.wrap(printable(str(doubt)), _WIDTH, initial_indent="# - ", subsequent_indent="#   ")
    lines.append("")
    for key, words in _KEYS.items():
        if key in content:
            lines += [f"# {words}", f"{key} = {_value(content[key])}"]
    for name, words in _TABLES.items():
        if name in content:
            lines += ["", f"# {words}", f"[{name}]", *_pairs(content[name])]
    return "\n".join(lines) + "\n"


def printable(text: str) -> str:
    """Return text without what would break a comment or a terminal."""
    shown = text.encode("utf-8", "surrogateescape").decode("utf-8", "replace")
    return "".join(letter if letter.isprintable() else " " for letter in shown)


def _pairs(table: Mapping[str, Any]) -> list[str]:
    return [f"{_key(key)} = {_value(value)}" for key, value in table.items()]


def _key(key: str) -> str:
    return key if _BARE.fullmatch(key) else _string(key)


def _string(text: str) -> str:
    """Return a basic string of TOML, of which the escapes of JSON are a part."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _value(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return _string(value)
    if isinstance(value, Mapping):
        inside = ", ".join(f"{_key(str(key))} = {_value(each)}" for key, each in value.items())
        return f"{{ {inside} }}"
    if isinstance(value, Sequence):
        return _array([_value(each) for each in value])
    if isinstance(value, float) and value == int(value):
        return f"{value:.1f}"
    return repr(value)


def _array(items: Sequence[str]) -> str:
    plain = f"[{', '.join(items)}]"
    if len(plain) <= _WIDTH - 12:
        return plain
    wrapped = textwrap.wrap(", ".join(items), _WIDTH, break_long_words=False, break_on_hyphens=False)
    if any(" " in item for item in items):
        return "[\n" + "".join(f"    {item},\n" for item in items) + "]"
    return "[\n" + "\n".join(f"    {line}" for line in wrapped) + ",\n]"
