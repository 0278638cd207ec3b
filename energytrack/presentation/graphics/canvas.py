"""Figures as SVG text or PNG bytes, the same bytes every time. The only part that imports matplotlib.

Nothing of a user's own matplotlib settings is used, and no window is opened.
"""

from __future__ import annotations

import io
import logging
import re
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from html import escape
from typing import TYPE_CHECKING, Any

from energytrack.errors import ReportError

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# colour-blind safe (Okabe and Ito, 2008)
BLUE, ORANGE, GREEN, BLACK = "#0072B2", "#D55E00", "#009E73", "#000000"
_DOTS_PER_INCH = 150
NARROW = 4.6  # inches: letters stay readable where a page is shown on a phone
_STYLE: dict[Any, Any] = {
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],  # comes with matplotlib
    "font.size": 10.0,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "svg.fonttype": "none",  # text stays text: it can be read aloud and searched
    "svg.hashsalt": "energytrack",  # else every element is named anew each time
}
_NO_DATE = {"Date": None, "Creator": None}


@dataclass(frozen=True)
class Drawing:
    """What to draw, and what it shows in words for those who do not see it."""

    on: Callable[[Axes], None]
    alternative: str
    height: float = 5.0  # inches
    width: float = 8.0


def need_matplotlib() -> None:
    """Raises ReportError where matplotlib is not installed."""
    logging.getLogger("matplotlib").setLevel(logging.ERROR)  # it tells of its font cache on standard error
    try:
        import matplotlib  # noqa: F401
    except ImportError:
        raise ReportError(
            "figures need the report extra, which is not installed: pip install 'energytrack[report]'"
        ) from None


def svg(drawing: Drawing) -> str:
    """An `<svg>` element, without XML prologue, that an HTML page can hold. Raises ReportError without matplotlib."""
    with _figure(drawing) as figure:
        text = io.StringIO()
        figure.savefig(text, format="svg", metadata=_NO_DATE)
    return _accessible(text.getvalue(), drawing.alternative)


def png(drawing: Drawing) -> bytes:
    """A PNG file, its text alternative in its description. Raises ReportError without matplotlib."""
    with _figure(drawing) as figure:
        data = io.BytesIO()
        figure.savefig(data, format="png", dpi=_DOTS_PER_INCH, metadata={"Description": drawing.alternative})
    return data.getvalue()


@contextmanager
def _figure(drawing: Drawing) -> Iterator[Figure]:
    need_matplotlib()
    import matplotlib
    from matplotlib.figure import Figure

    with matplotlib.rc_context(), warnings.catch_warnings():
        warnings.filterwarnings("ignore", "Glyph")  # a name in a script the font lacks shows boxes in a PNG
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_STYLE)
        figure = Figure(figsize=(drawing.width, drawing.height), layout="constrained")
        drawing.on(figure.add_subplot())
        yield figure


def _accessible(text: str, alternative: str) -> str:
    """The element alone, named as a picture with its text alternative; what it says of its maker is left out."""
    element = text[text.index("<svg") :]
    element = re.sub(r"\s*<metadata>.*?</metadata>", "", element, flags=re.DOTALL)
    said = escape(alternative)
    opened = f'<svg role="img" aria-label="{said}"' + element.removeprefix("<svg").split(">", 1)[0] + ">"
    return f"{opened}\n <title>{said}</title>{element.split('>', 1)[1]}"
