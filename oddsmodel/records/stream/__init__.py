"""Records that do not fit into memory: the same coded records, block by block."""

from oddsmodel.records.stream.source import BLOCK
from oddsmodel.records.stream.stream import RecordStream, open_stream

__all__ = ["BLOCK", "RecordStream", "open_stream"]
