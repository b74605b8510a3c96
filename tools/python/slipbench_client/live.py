"""A plot that follows a stream.

    python3 -m slipbench_client.live ENDPOINT [--columns speed_rpm,ekf.speed_rpm] [--window 5] [--save out.png]

Above the chosen columns, below the estimated minus the true speed of every estimator. Space holds the picture still, q
closes it. With --save the last picture is written when the run is over; without a display that is all it does.
Exit status: 0 the run is over or the window closed; 2 wrong use; 3 the stream fell silent or a file failed; 130 Ctrl-C.
"""
from __future__ import annotations

import argparse
import sys
import time
from typing import Any, Sequence

from .errors import ClientError, StreamError, VersionError, needs
from .figure import Figure
from .messages import Description
from .stream import Stream

DRAWING_S = 0.05  # between two pictures


def default_columns(description: Description) -> list[str]:
    """Reference and true speed, and the speed of each estimator, as far as they are there."""
    names = description.names
    estimated = [name for name in names if name.endswith(".speed_rpm") and not name.startswith("measured.")]
    wanted = ["speed_reference_rpm", "speed_rpm", *estimated]
    return [name for name in wanted if name in names] or [name for name in names if name != "time_s"][:1]


def follow(stream: Stream, figure: Figure, columns: Sequence[str], silent_s: float) -> str:
    """Feeds the figure until the run is over, the window is closed or the stream silent for silent_s; tells which.

    Never waits on the publisher for longer than a twentieth of a second, so that the window stays alive.
    """
    while not figure.closed:
        until = time.monotonic() + DRAWING_S
        while time.monotonic() < until and stream.end is None:
            block = stream.poll(max(0.0, until - time.monotonic()))
            if block is not None:
                if block.new_run:
                    figure.begin(block.description, list(columns) or default_columns(block.description))
                figure.add(block)
        if stream.end is not None:
            lost = f", {stream.lost_rows} rows lost" if stream.lost_rows else ""
            figure.state(f"{stream.end.status}: {stream.end.rows} rows{lost}")
            return "over"
        if stream.description is not None and stream.silent_s > silent_s:
            figure.state(f"nothing for {stream.silent_s:.0f} s, no end")
            return "silent"
        silent = f"nothing for {stream.silent_s:.0f} s" if stream.silent_s > 2 else ""
        lost = f"{stream.lost_rows} rows lost" if stream.lost_rows else ""
        figure.state(silent or lost if stream.description else f"waiting for a run on {stream.endpoint}")
        if figure.shown:
            figure.draw()
    return "closed"


def parser() -> argparse.ArgumentParser:
    words = argparse.ArgumentParser(prog="slipbench-live", description="follows a run that slipbench publishes",
                                    epilog="example: slipbench-live 5600 --columns speed_rpm,ekf.speed_rpm --window 2")
    add = words.add_argument
    add("endpoint", metavar="ENDPOINT", help="tcp://HOST:PORT, ipc://PATH or PORT, as `slipbench run --publish` has it")
    add("--columns", default="", metavar="A,B", help="columns above, of two units at most; default: the speeds")
    add("--window", type=float, default=5.0, metavar="S", help="seconds of the run that are shown (5)")
    add("--save", metavar="FILE", help="write the last picture: .png, .svg or .pdf")
    add("--timeout", type=float, default=10.0, metavar="S", help="give up after so many seconds of silence once a run has begun (10)")
    return words


def main(arguments: Sequence[str] | None = None) -> int:
    """The command; returns its exit status."""
    given = parser().parse_args(arguments)
    try:
        import matplotlib.pyplot as plt
    except ImportError:
        return fail(needs("matplotlib", "plot", "a live plot"), 3)
    try:
        figure = Figure(plt, given.window)
        if not figure.shown and not given.save:
            return fail(ClientError("there is no display here: give --save FILE for the last picture"), 2)
        check_ending(figure, given.save)
        with Stream(given.endpoint) as stream:
            if not figure.shown:  # where there is, the window says so
                print(f"waiting for a run on {stream.endpoint} (Ctrl-C to stop)", file=sys.stderr)
            try:
                why = follow(stream, figure, [name for name in given.columns.split(",") if name], given.timeout)
            except KeyboardInterrupt:
                why = "interrupted"
            save(figure, given.save)
            if why == "silent":
                return fail(StreamError(f"{stream.endpoint}: nothing for {given.timeout:g} s and no end: "
                                        "the publisher is gone, or stopped"), 3)
        if why == "over" and figure.shown and not given.save:
            figure.stay()
        return 130 if why == "interrupted" else 0
    except KeyboardInterrupt:
        return 130
    except (VersionError, OSError) as error:
        return fail(error, 3)
    except ClientError as error:
        return fail(error, 2)


def check_ending(figure: Any, path: str | None) -> None:
    """Before the run, not after it. Raises ClientError for an ending that matplotlib does not write."""
    known = sorted(figure.figure.canvas.get_supported_filetypes())
    if path and path.rpartition(".")[2].lower() not in known:
        raise ClientError(f"--save {path}: the file's ending tells the format; there are {', '.join(known)}")


def save(figure: Any, path: str | None) -> None:
    if path:
        figure.save(path)


def fail(error: Exception, status: int) -> int:
    print(f"slipbench-live: {error}", file=sys.stderr)
    return status


if __name__ == "__main__":
    sys.exit(main())
