"""The live plot's picture: chosen columns above, errors of the estimated speeds below."""
from __future__ import annotations

from typing import Any, Sequence

from .columns import Column
from .errors import ClientError, NoColumn
from .history import History, outline
from .messages import Block, Description

# Told apart by colour-blind eyes too: M. Okabe, K. Ito, "Color Universal Design", 2008; no yellow, too pale on white.
COLOURS = ("#000000", "#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
NO_SCREEN = ("agg", "svg", "pdf", "ps", "cairo", "pgf", "template")  # backends of matplotlib that open no window


def _line(axis: Any, colour: str, label: str) -> Any:
    return axis.plot([], [], color=colour, linewidth=1.0, label=label)[0]


def _legend(axis: Any, lines: Sequence[Any]) -> None:
    """Above the panel, where it hides nothing."""
    axis.legend(handles=lines, loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=5, fontsize="small", frameon=False,
                borderpad=0.1)


class Figure:
    """Panels over a sliding window of time. `shown`: there is a window on a screen; `closed`: it has been closed."""

    def __init__(self, plt: Any, window_s: float) -> None:
        """plt: matplotlib.pyplot; window_s: seconds of the run that are shown. Raises ClientError where not above 0."""
        if not window_s > 0:
            raise ClientError(f"--window {window_s:g}: seconds of the run, above 0")
        self.plt, self.window_s = plt, window_s
        self.shown = plt.get_backend().lower() not in NO_SCREEN
        self.closed = self.held = False
        self.figure = plt.figure(figsize=(10, 6), layout="constrained")
        self.figure.canvas.mpl_connect("close_event", self._close)
        self.figure.canvas.mpl_connect("key_press_event", self._key)
        self.history = History((), window_s)
        self.axes: list[Any] = []
        self.lines: dict[str, Any] = {}   # column -> line of the upper panel
        self.errors: dict[str, Any] = {}  # estimator -> line of the lower one
        self.title = self.now = ""
        if self.shown:
            self.figure.show()

    def begin(self, description: Description, columns: Sequence[str]) -> None:
        """A new run: panels for these columns and for the estimators that are there.

        Raises NoColumn; ClientError for columns of more than two units.
        """
        known = {column.name: column for column in description.columns}
        for name in columns:
            if name not in known:
                raise NoColumn(name, known)
        chosen = [known[name] for name in dict.fromkeys(columns)]
        units = list(dict.fromkeys(column.unit for column in chosen))
        if len(units) > 2:
            found = ", ".join(unit or "1" for unit in units)
            raise ClientError(f"--columns: these are in {found}; a panel has room for two units")
        estimators = [name.removesuffix(".trust") for name in known if name.endswith(".trust")]
        speeds = {name: f"{name}.speed_rpm" for name in estimators if f"{name}.speed_rpm" in known and "speed_rpm" in known}
        needed = [column.name for column in chosen] + ["speed_rpm"] * bool(speeds) + list(speeds.values())
        self.history = History(list(dict.fromkeys(needed)), self.window_s)
        self.title = f"{description.scenario}, seed {description.seed}"
        self.figure.clear()
        heights = [3, 2] if speeds else [1]
        upper, *lower = self.figure.subplots(len(heights), 1, sharex=True, squeeze=False, height_ratios=heights)[:, 0]
        self.axes = [upper, *lower]
        self._fill_upper(upper, chosen, units)
        self._fill_lower(lower[0] if lower else None, speeds)
        self.axes[0].set_xlim(0, self.window_s)
        for axis in (upper, *lower):
            axis.grid(alpha=0.3)
        (lower or [upper])[0].set_xlabel("time, s")

    def _fill_upper(self, left: Any, chosen: Sequence[Column], units: Sequence[str]) -> None:
        sides, self.lines = {units[0]: left}, {}
        if len(units) == 2:
            sides[units[1]] = left.twinx()
            self.axes.append(sides[units[1]])
        for k, column in enumerate(chosen):
            self.lines[column.name] = _line(sides[column.unit], COLOURS[k % len(COLOURS)], column.name)
        for unit, axis in sides.items():
            there = [column for column in chosen if column.unit == unit]
            words = there[0].meaning or there[0].name if len(there) == 1 else "speed" if unit == "rpm" else ""
            axis.set_ylabel(", ".join(part for part in (words, unit) if part))
        _legend(left, list(self.lines.values()))

    def _fill_lower(self, axis: Any, speeds: dict[str, str]) -> None:
        used = {line.get_color() for line in self.lines.values()}
        free = [colour for colour in COLOURS if colour not in used] or list(COLOURS)
        self.errors = {}
        for k, (name, column) in enumerate(speeds.items()):
            colour = self.lines[column].get_color() if column in self.lines else free[k % len(free)]
            self.errors[name] = _line(axis, colour, name)
        if speeds:
            axis.axhline(0.0, color="0.5", linewidth=0.8)
            axis.set_ylabel("estimated minus\ntrue speed, rpm")
            _legend(axis, list(self.errors.values()))

    def add(self, block: Block) -> None:
        """Takes a block's rows into the window."""
        self.history.add(block)

    def state(self, words: str) -> None:
        """What stands beside the title."""
        self.now = words

    def draw(self) -> None:
        """Brings the picture up to date, and lets the window answer keys and mouse."""
        if not self.held:
            self._update()
            self.figure.canvas.draw_idle()
        self.figure.canvas.flush_events()

    def save(self, path: str) -> None:
        """Writes the picture. Raises OSError."""
        self._update()
        self.figure.savefig(path, dpi=100)

    def stay(self) -> None:
        """Draws once more and leaves the window to its reader until it is closed."""
        self.held = False
        self.draw()
        self.plt.show(block=True)

    def _update(self) -> None:
        time, columns = self.history.rows()
        for name, line in self.lines.items():
            line.set_data(*outline(time, columns[name]))
        for name, line in self.errors.items():
            line.set_data(*outline(time, columns[f"{name}.speed_rpm"] - columns["speed_rpm"]))
        for axis in self.axes:
            axis.relim()
            axis.autoscale_view(scalex=False)
        if self.axes and len(time):
            last = max(time[-1], self.window_s)
            self.axes[0].set_xlim(last - self.window_s, last)
        self.figure.suptitle("   ".join(part for part in (self.title, self.now) if part), fontsize="medium")

    def _close(self, _: Any) -> None:
        self.closed = True

    def _key(self, event: Any) -> None:
        if event.key == " ":
            self.held = not self.held
        elif event.key == "q":
            self.closed = True
