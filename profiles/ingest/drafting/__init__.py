"""An unknown text file looked at, and a complete layout proposed for it."""

from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.draft import Draft, ShownRow, draft

__all__ = ["Doubt", "Draft", "ShownRow", "draft"]
