"""The record as one self-contained HTML page: no script, nothing from elsewhere, every text escaped."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import Any

from crosscheck.report import words
from crosscheck.report.content import Block, Record
from crosscheck.report.pictures import Picture
from crosscheck.report.sketch import svg


def page(record: Record) -> str:
    """The record as HTML."""
    from markupsafe import Markup

    count = iter(range(10_000))

    def drawn(picture: Picture) -> Markup:
        return Markup(svg(picture.sketch.figure(), picture.says, f"picture {next(count)}"))  # noqa: S704 - matplotlib escapes text

    return str(_template().render(record=record, kind=_kind, drawn=drawn, anchor=_anchor))


def _kind(block: Block) -> str:
    return type(block).__name__.lower()


def _anchor(number: int) -> str:
    return f"part-{number}"


@cache
def _template() -> Any:
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    environment = Environment(
        loader=FileSystemLoader(Path(__file__).parent, encoding="utf-8"), autoescape=True, undefined=StrictUndefined,
        trim_blocks=True, lstrip_blocks=True, finalize=_finalize, keep_trailing_newline=True,
    )  # fmt: skip
    return environment.get_template("page.html.j2")


def _finalize(value: Any) -> Any:
    """Text as it can be seen; markup and numbers as they are."""
    return words.visible(value) if type(value) is str else value
