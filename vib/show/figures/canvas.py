"""The sheet that pictures are drawn on: style, colours, text that is only text, SVG and PNG."""

from __future__ import annotations

import io
import re
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Okabe & Ito, Color Universal Design (2008): told apart by colour-blind readers; the yellow is left out,
# it is too faint on white. Dashes and markers go with them, so that grey prints can be read.
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
DASHES: tuple[Any, ...] = (
    "-",
    (0, (6, 2)),
    (0, (2, 1.2)),
    (0, (6, 1.5, 1.5, 1.5)),
    "-",
    (0, (6, 2)),
    (0, (2, 1.2)),
)
MARKERS = ("o", "s", "^", "D", "v", "P", "X")
INK, FAINT, PAPER = "#222222", "#9a9a9a", "#ffffff"
GOOD, BAD = COLOURS[2], COLOURS[1]
_MOST_CHARACTERS = 40

_STYLE: dict[str, Any] = {
    "text.parse_math": False,  # a "$" in a name is a dollar sign
    "svg.fonttype": "none",  # text stays text: small files, and it can be searched
    "svg.hashsalt": "vib",  # the same picture is the same file
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans", "Arial", "Helvetica", "sans-serif"],
    "font.size": 8.0,
    "axes.titlesize": 9.0,
    "axes.titleweight": "bold",
    "axes.titlelocation": "left",
    "axes.labelsize": 8.0,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "text.color": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "axes.linewidth": 0.7,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.grid": True,
    "axes.axisbelow": True,
    "axes.unicode_minus": False,
    "grid.color": "#e2e2e2",
    "grid.linewidth": 0.5,
    "lines.linewidth": 1.3,
    "legend.frameon": True,
    "legend.framealpha": 0.85,
    "legend.edgecolor": "none",
    "legend.fancybox": False,
    "legend.fontsize": 7.5,
    "figure.dpi": 100,
    "path.simplify": True,
}


@dataclass(frozen=True, eq=False)
class Picture:
    """A drawn figure, its file name without ending, and what it shows in words."""

    name: str
    figure: Figure
    words: str

    def svg(self, prefix: str = "") -> str:
        """One ``<svg>`` element; ids start with the prefix, so that many can share a page."""
        return _svg(self.figure, prefix or self.name, self.words)

    def content(self, kind: str) -> tuple[str, bytes]:
        """File name and content as "svg" or "png"."""
        if kind == "png":
            return f"{self.name}.png", _saved(self.figure, "png", dpi=200)
        document = '<?xml version="1.0" encoding="utf-8"?>\n' + self.svg() + "\n"
        return f"{self.name}.svg", document.encode("utf-8")


@contextmanager
def style() -> Iterator[None]:
    """Our style and nothing of the user's own settings."""
    import matplotlib

    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        settings: Any = matplotlib.rcParams
        settings.update(_STYLE)
        yield


def sheet(width: float, height: float) -> Figure:
    """An empty figure, inches; call it inside `style`."""
    from matplotlib.figure import Figure

    return Figure(figsize=(width, height), layout="constrained")


def short(text: str, most: int = _MOST_CHARACTERS) -> str:
    """Text that fits a label."""
    return text if len(text) <= most else text[: most - 1] + "…"


def legend(axes: Axes, handles: Sequence[Any], labels: Sequence[str], **where: Any) -> None:
    """A legend whose labels may be any text, also such as start with an underscore."""
    if not handles:
        return
    drawn = axes.legend(handles, [str(number) for number in range(len(labels))], **where)
    for text, label in zip(drawn.get_texts(), labels, strict=True):
        text.set_text(short(label))


def _saved(figure: Figure, kind: str, **more: Any) -> bytes:
    from matplotlib.backends.backend_agg import FigureCanvasAgg

    out = io.BytesIO()
    with style(), warnings.catch_warnings():
        # a name in a script that our measuring font lacks is still shown by the reader's own font
        warnings.filterwarnings("ignore", message=r"Glyph .* missing from")
        FigureCanvasAgg(figure)
        metadata: dict[str, Any] = {"Software": None} if kind == "png" else {"Date": None, "Creator": None}
        figure.savefig(out, format=kind, metadata=metadata, facecolor=PAPER, **more)
    return out.getvalue()


_LONG_NUMBER = re.compile(r"-?\d+\.\d{3,}")


def _shorter(number: re.Match[str]) -> str:
    return f"{float(number[0]):.2f}".rstrip("0").rstrip(".")


def _svg(figure: Figure, prefix: str, words: str) -> str:
    import xml.etree.ElementTree as Tree

    Tree.register_namespace("", "http://www.w3.org/2000/svg")
    Tree.register_namespace("xlink", "http://www.w3.org/1999/xlink")
    space = "{http://www.w3.org/2000/svg}"
    # the dots are those of painted surfaces; all else is drawn as lines
    root = Tree.fromstring(_saved(figure, "svg", dpi=200))
    tag = re.sub(r"[^A-Za-z0-9_-]", "-", prefix)
    for element in root.iter():
        for name, value in element.attrib.items():
            if name == "d":
                # a hundredth of a point is finer than any printer
                element.set(name, _LONG_NUMBER.sub(_shorter, value))
            elif name == "id":
                element.set(name, f"{tag}-{value}")
            elif name.endswith("href") and value.startswith("#"):
                element.set(name, f"#{tag}-{value[1:]}")
            elif "url(#" in value:
                element.set(name, value.replace("url(#", f"url(#{tag}-"))
    for metadata in root.findall(f"{space}metadata"):
        root.remove(metadata)
    for styles in root.iter(f"{space}style"):
        # the sheet of matplotlib speaks of every element of the page it is put into
        styles.text = ""
    root.set("style", "stroke-linejoin: round; stroke-linecap: butt")
    root.set("role", "img")
    root.set("aria-label", words)
    return Tree.tostring(root, encoding="unicode")
