"""A page as one HTML file that needs nothing beside itself: no network, no script."""

from __future__ import annotations

from energytrack.errors import ReportError
from energytrack.presentation.report.embed import embedded
from energytrack.presentation.report.page import Page

_TEMPLATE = "page.html.j2"


def need_jinja() -> None:
    """Raises ReportError where Jinja2 is not installed."""
    try:
        import jinja2  # noqa: F401
    except ImportError:
        raise ReportError(
            "an HTML report needs the report extra, which is not installed: pip install 'energytrack[report]'"
        ) from None


def html(page: Page) -> str:
    """The whole file; everything a user typed is escaped. Raises ReportError without Jinja2 or matplotlib."""
    need_jinja()
    from jinja2 import Environment, PackageLoader, StrictUndefined
    from markupsafe import Markup

    environment = Environment(
        loader=PackageLoader("energytrack.presentation.report", "."),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.globals["style"] = Markup(_style())
    environment.globals["draw"] = lambda picture: Markup(embedded(picture.drawing, picture.name))
    return environment.get_template(_TEMPLATE).render(page=page)


def _style() -> str:
    from importlib.resources import files

    return files("energytrack.presentation.report").joinpath("page.css").read_text(encoding="utf-8")
