"""What can go wrong, in sentences that say where, what was found, and the way out."""
from __future__ import annotations

import difflib
from typing import Iterable


class ClientError(Exception):
    """Any error of this package."""


class TraceError(ClientError):
    """A file that is no trace, or not a whole one."""


class StreamError(ClientError):
    """An endpoint that cannot be used, or a message that the protocol does not know."""


class VersionError(StreamError):
    """A stream or a trace of a later version than this package knows."""


class StreamSilent(StreamError, TimeoutError):
    """Nothing came for longer than was allowed."""


class NoColumn(ClientError, KeyError):
    """A column that is not there."""

    def __init__(self, name: object, names: Iterable[str]) -> None:
        self.name = name
        names = list(names)
        near = difflib.get_close_matches(str(name), names, n=3)
        hint = f"did you mean {', '.join(near)}?" if near else f"there are {', '.join(names) or 'none'}"
        self.message = f"no column '{name}': {hint}"
        super().__init__(self.message)

    def __str__(self) -> str:  # KeyError would show the sentence in quotes
        return self.message


def needs(module: str, extra: str, what: str) -> ClientError:
    """The error for a library that is not installed."""
    return ClientError(f"{what} needs the Python module '{module}', which is not installed: "
                       f"pip install 'slipbench-client[{extra}]', or Debian's python3-{module.replace('pyzmq', 'zmq')}")
