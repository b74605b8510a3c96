"""Traces and live streams of slipbench as NumPy arrays.

    read_trace(path) -> Trace           a CSV or HDF5 trace
    Stream(endpoint)                    a run as it happens: blocks of rows, or all of them at once
    python3 -m slipbench_client.live    a plot that follows a stream
"""
from .columns import Column, unit_of
from .errors import ClientError, StreamError, StreamSilent, TraceError, VersionError
from .messages import KNOWN_VERSION, Block, Description, End
from .stream import Stream
from .trace import Trace
from .trace_files import read_trace

__all__ = ["Block", "ClientError", "Column", "Description", "End", "KNOWN_VERSION", "Stream", "StreamError", "StreamSilent",
           "Trace", "TraceError", "VersionError", "read_trace", "unit_of"]
__version__ = "0.4.0"
