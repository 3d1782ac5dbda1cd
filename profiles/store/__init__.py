"""All files: whole or not at all, checksummed, the same bytes from the same inputs, opened lazily."""

from profiles.store.atomic import checksum, clear_leftovers, make_folder, replacing
from profiles.store.blocks import Block, padded_blocks
from profiles.store.netcdf import TIME_BLOCK, open_dataset, write_blocks, write_dataset
from profiles.store.records import date_of, folder_lock, read_record, write_record, write_text
from profiles.store.tables import read_table, write_table

__all__ = [
    "TIME_BLOCK",
    "Block",
    "checksum",
    "clear_leftovers",
    "date_of",
    "folder_lock",
    "make_folder",
    "open_dataset",
    "padded_blocks",
    "read_record",
    "read_table",
    "replacing",
    "write_blocks",
    "write_dataset",
    "write_record",
    "write_table",
    "write_text",
]
