"""How our figures look: colours, line styles, sizes, and one way to write them to bytes.

Every colour pair stays apart for readers without red or green cones (a test computes it), and
line styles differ as well, so that a grey print can be read. No global state: no pyplot.
"""

from __future__ import annotations

import io
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import Any, Final

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, LogLocator, MaxNLocator, NullFormatter, ScalarFormatter

from meanfree.report.sampling import TimeAxis
from meanfree.report.wording import number, power_of_ten

PALETTE: Final[tuple[str, ...]] = (
    "#002299",
    "#cc7700",
    "#0088ff",
    "#883300",
    "#442255",
    "#aa8877",
    "#8888bb",
    "#552222",
)
DASHES: Final[tuple[Any, ...]] = (
    "-",
    (0, (6, 2)),
    (0, (2, 1.5)),
    (0, (7, 2, 1.5, 2)),
    (0, (9, 3)),
    (0, (4, 1.5, 1, 1.5, 1, 1.5)),
    (0, (1, 1)),
    (0, (10, 2, 2, 2)),
)
INK: Final[str] = "#222222"
GUIDE: Final[str] = "#8a8a8a"
WIDTH: Final[float] = 6.2
LEFT: Final[float] = 0.88
LABEL_FROM_AXIS: Final[float] = 0.52
"""Where the words of every y axis stand, left of it [inch], so that panels line up."""
DPI: Final[int] = 160

_RC: Final[dict[str, Any]] = {
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],
    "font.size": 9.5,
    "axes.labelsize": 9.5,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.8,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "xtick.color": INK,
    "ytick.color": INK,
    "xtick.labelsize": 9.0,
    "ytick.labelsize": 9.0,
    "lines.linewidth": 1.8,
    "text.parse_math": False,  # text of a case may hold dollar signs
    "svg.fonttype": "path",
    "svg.hashsalt": "meanfree",
    "savefig.dpi": DPI,
    "path.simplify_threshold": 0.04,
}


@contextmanager
def drawing() -> Iterator[None]:
    """Our settings, and a reader's own matplotlib settings left alone."""
    with mpl.rc_context():
        mpl.rcdefaults()
        for key, value in _RC.items():
            mpl.rcParams[key] = value  # type: ignore[index]
        yield


def panels(
    heights: Sequence[float], beside: float, above: float, between: float = 0.28
) -> tuple[Figure, list[Axes]]:
    """A figure of stacked panels with one axis to the right, all measures in inches.

    ``beside`` is the room for words right of the axes, ``above`` that over the first panel,
    ``between`` that from one panel to the next.
    """
    space, below, left = between, 0.52, LEFT
    whole = sum(heights) + space * (len(heights) - 1) + below + above
    figure = Figure(figsize=(WIDTH, whole))
    axes: list[Axes] = []
    top = whole - above
    for height in heights:
        box = (
            left / WIDTH,
            (top - height) / whole,
            (WIDTH - left - beside) / WIDTH,
            height / whole,
        )
        axes.append(figure.add_axes(box, sharex=axes[0] if axes else None))
        axes[-1].yaxis.set_label_coords(-LABEL_FROM_AXIS / (WIDTH - LEFT - beside), 0.5)
        top -= height + space
    for ax in axes[:-1]:
        ax.tick_params(labelbottom=False)
    return figure, axes


def style_of(index: int) -> dict[str, Any]:
    """Colour and dashes of the n-th curve; after the last colour the dashes shift."""
    n = len(PALETTE)
    return {"color": PALETTE[index % n], "linestyle": DASHES[(index + index // n) % n]}


def set_time(ax: Axes, axis: TimeAxis) -> None:
    """Scale, limits and label of the time axis; data are in the axis' own unit."""
    if axis.logarithmic:
        ax.set_xscale("log")
        ax.set_xlim(axis.start / axis.seconds, axis.end / axis.seconds)
        plain_decades(ax.xaxis)
    else:
        ax.set_xlim(0.0, axis.end / axis.seconds)
        ax.xaxis.set_major_formatter(_plain())
    label(ax, x=f"Time ({axis.unit})")


def set_linear(ax: Axes, low: float | None, high: float) -> None:
    """A linear y axis that starts at ``low`` (or where the data do) with a little room above."""
    if low is not None:
        ax.set_ylim(low, high * 1.06 if high > 0 else 1.0)
    ax.yaxis.set_major_locator(MaxNLocator(6, steps=[1, 2, 2.5, 5, 10]))
    ax.yaxis.set_major_formatter(_plain())


def _plain() -> ScalarFormatter:
    formatter = ScalarFormatter(useOffset=False, useMathText=False)
    formatter.set_powerlimits((-4, 6))
    return formatter


def set_logarithmic(ax: Axes, low: float, high: float) -> None:
    """A logarithmic y axis."""
    ax.set_yscale("log")
    ax.set_ylim(low, high)
    plain_decades(ax.yaxis)


def plain_decades(axis: Any) -> None:
    """Powers of ten as a person writes them, few enough to be read."""
    axis.set_major_locator(LogLocator(10, numticks=9))
    axis.set_major_formatter(FuncFormatter(lambda x, _: decade(x, *axis.get_view_interval())))
    axis.set_minor_formatter(NullFormatter())


def decade(value: float, low: float, high: float) -> str:
    """A power of ten: ``0.01`` on a short axis, ``10⁻²`` on one that goes far.

    >>> decade(0.01, 0.005, 500.0), decade(0.01, 1e-9, 1.0), decade(0.0, 1e-310, 1.0)
    ('0.01', '10⁻²', '')
    """
    if value <= 0:  # below the smallest number there is, a tick has come down to zero
        return ""
    if low >= 1e-4 and high <= 1e5:
        return number(value, 1)
    return power_of_ten(value)


def label(ax: Axes, x: str = "", y: str = "") -> None:
    """Axis labels."""
    if x:
        ax.set_xlabel(x)
    if y:
        ax.set_ylabel(y)


def rendered(figure: Figure) -> tuple[str, bytes]:
    """A figure as SVG text and as PNG bytes, the same bytes every time."""
    vector, raster = io.StringIO(), io.BytesIO()
    with warnings.catch_warnings():
        # A name in a script that the font lacks shows as boxes; the tables have it in full.
        warnings.filterwarnings("ignore", message="Glyph .* missing from font")
        figure.savefig(vector, format="svg", metadata={"Date": None, "Creator": None})
        figure.savefig(raster, format="png", metadata={"Software": None})
    return vector.getvalue(), raster.getvalue()
