"""Quality control: a chain in, the same chain with flags out, and what the flags say of its sensors."""

from profiles.qc.quality_control import flag_blocks, quality_control
from profiles.qc.summary import SUMMARY_COLUMNS, data_return, fault_list, gap_list

__all__ = ["SUMMARY_COLUMNS", "data_return", "fault_list", "flag_blocks", "gap_list", "quality_control"]
