"""A frontier as a figure: black on white, told apart by lines, marks and words, not by colour."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING, Any

from designer.views.weighing_words import CRITERIA
from designer.weighing.frontier import Frontier

if TYPE_CHECKING:
    from designer.weighing.tradeoff import Tradeoff

MARKED = 40
"""Corners up to which each is marked."""
MISSING = (
    "No plots: matplotlib is not installed. `pip install matplotlib` (or the extra 'plot') adds "
    "them; everything else is saved."
)


def installed() -> bool:
    """Whether matplotlib is there to draw with."""
    from importlib.util import find_spec

    return find_spec("matplotlib") is not None


def figure(found: Tradeoff, one: Frontier, kind: str) -> bytes:
    """The frontier as the bytes of a "png" or an "svg" file, the same each time."""
    import matplotlib as mpl
    from matplotlib.figure import Figure

    with mpl.rc_context({"svg.hashsalt": "designer", "svg.fonttype": "none", "font.size": 10}):
        drawing = Figure(figsize=(6.4, 4.4), dpi=150, layout="constrained")
        _draw(drawing.add_subplot(), found, one)
        stream = io.BytesIO()
        metadata: dict[str, Any] = {"Date": None} if kind == "svg" else {"Software": None}
        drawing.savefig(stream, format=kind, metadata=metadata)
    return stream.getvalue()


def _draw(axes: Any, found: Tradeoff, one: Frontier) -> None:
    unit = found.setting.money
    xs = [float(x) for x, _ in one.corners]
    ys = [float(y) for _, y in one.corners]
    top, right = max(ys) * 1.12 or 1.0, max(xs) * 1.12 or 1.0
    axes.fill_between(
        [*xs, right],
        [*ys, ys[-1]],
        top,
        facecolor="0.93",
        edgecolor="none",
        zorder=0,
    )
    axes.plot([xs[0], xs[0]], [ys[0], top], color="0.35", linestyle=":", linewidth=1)
    axes.plot([xs[-1], right], [ys[-1], ys[-1]], color="0.35", linestyle=":", linewidth=1)
    marks = {"marker": "o", "markersize": 5, "markerfacecolor": "white"}
    style = "-" if one.complete else "--"
    few = marks if len(one.corners) <= MARKED else {}
    axes.plot(xs, ys, color="black", linestyle=style, linewidth=1.6, clip_on=False, **few)
    if len(one.corners) <= 6:
        for x, y, corner in zip(xs, ys, one.corners, strict=True):
            label = f"({_short(corner[0])}, {_short(corner[1])})"
            axes.annotate(label, (x, y), (7, 7), textcoords="offset points", fontsize=9)
    axes.text(0.97, 0.95, "can be had", transform=axes.transAxes, ha="right", va="top")
    axes.set_xlim(0, right)
    axes.set_ylim(0, top)
    axes.set_xlabel(f"{CRITERIA[one.x]} ({unit})")
    axes.set_ylabel(f"{CRITERIA[one.y]} ({unit})")
    proved = "proved" if one.proved and one.complete else "unproved"
    whole = proved if one.complete else "INCOMPLETE"
    corners = "corner" if len(one.corners) == 1 else "corners"
    axes.set_title(
        f"{found.setting.title}\n{len(one.corners)} {corners}, {whole}", fontsize=10, loc="left"
    )
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _short(value: Any) -> str:
    written = str(value)
    return written if len(written) <= 9 else f"{float(value):.4g}"
