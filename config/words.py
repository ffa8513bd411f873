"""Names, titles and other plain texts."""

import re
from string import Formatter
from typing import Annotated, Any

from pydantic import AfterValidator, Field, Strict

from config.part import wrong

_NAME = re.compile(r"\w[\w .\-]{0,59}")
TITLE_FIELDS = ("split", "source")


def _name(text: str) -> str:
    if _NAME.fullmatch(text) is None or text != text.strip():
        raise wrong()
    return text


def _line(text: str) -> str:
    if not text.isprintable() or not text.strip() or text != text.strip():
        raise wrong()
    return text


def _title(text: str) -> str:
    _line(text)
    try:
        parts = list(Formatter().parse(text))
    except ValueError:
        raise wrong() from None
    for _, field, form, conversion in parts:
        if field is not None and (field not in TITLE_FIELDS or form or conversion):
            raise wrong()
    return text


def title_fields(template: Any) -> set[str]:
    """The fields that a title template uses; none if it is no template."""
    try:
        return {field for _, field, _, _ in Formatter().parse(template) if field}
    except (TypeError, ValueError):
        return set()


Name = Annotated[
    str,
    AfterValidator(_name),
    Field(description="a name of up to 60 letters, digits, spaces, dots, hyphens and underscores"),
]
Slate = Annotated[
    str, AfterValidator(_line), Field(max_length=100, description="one line of up to 100 characters")
]
Title = Annotated[
    str,
    AfterValidator(_line),
    Field(max_length=200, description="one line of up to 200 characters"),
]
TitleTemplate = Annotated[
    str,
    AfterValidator(_title),
    Field(
        max_length=200,
        description="one line of up to 200 characters in which {split} and {source} may stand",
    ),
]
SplitValue = Annotated[str, Field(min_length=1, max_length=500, description="a split value")]
LeaveOut = Annotated[
    tuple[SplitValue, ...],
    Strict(False),
    Field(max_length=10_000, description="a list of split values in quotes"),
]
