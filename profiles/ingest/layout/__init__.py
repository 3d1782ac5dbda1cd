"""How a delivery is written: the layout file as typed, validated, frozen objects."""

from profiles.ingest.layout.kinds import (
    KINDS,
    BlockedLayout,
    CountedLayout,
    Layout,
    LongLayout,
    NetcdfLayout,
    WideLayout,
    load_layout,
)
from profiles.ingest.layout.parts import GREATEST_DEPTH, WHITESPACE, Quality, Scale
from profiles.ingest.layout.series import MOORING_MARK, SeriesLayout
from profiles.ingest.layout.text import TextLayout
from profiles.ingest.layout.time import TimeSettings

__all__ = [
    "GREATEST_DEPTH",
    "KINDS",
    "MOORING_MARK",
    "WHITESPACE",
    "BlockedLayout",
    "CountedLayout",
    "Layout",
    "LongLayout",
    "NetcdfLayout",
    "Quality",
    "Scale",
    "SeriesLayout",
    "TextLayout",
    "TimeSettings",
    "WideLayout",
    "load_layout",
]
