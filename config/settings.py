"""The settings file as a whole."""

import datetime
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, Strict, ValidationInfo

from config.addresses import SecretAddress
from config.calendar_words import Zone
from config.durations import Deadline
from config.judging import Judgement, Model
from config.outlets import Outlet
from config.part import Part, surroundings, wrong
from config.sources import Source


def _database(raw: Any, info: ValidationInfo) -> Path:
    if not isinstance(raw, str) or not raw or "\0" in raw or "://" in raw:
        raise wrong()
    return surroundings(info).folder / raw


Database = Annotated[
    Path, BeforeValidator(_database), Field(description="the path of a file, from the settings file's folder")
]


class Service(Part):
    """The program itself."""

    database: Database = Field(default="knickpoint.sqlite", validate_default=True)
    zone: Zone = "UTC"
    good_rounds_address: SecretAddress | None = None
    stop_within: Deadline = datetime.timedelta(seconds=20)
    log_form: Literal["words", "json"] = Field(default="words", description='"words" or "json"')
    log_level: Literal["debug", "info", "warning", "error"] = Field(
        default="info", description='"debug", "info", "warning" or "error"'
    )


class Sections(Part):
    """The tables of the file."""

    service: Service = Field(default={}, validate_default=True, description="a table [service]")
    judgement: Judgement = Field(default=Judgement(), description="a table [judgement]")
    model: Model = Field(default=Model(), description="a table [model]")
    sources: Annotated[tuple[Source, ...], Strict(False)] = Field(
        alias="source", min_length=1, description="one or more tables [[source]]"
    )
    outlets: Annotated[tuple[Outlet, ...], Strict(False)] = Field(
        default=(), alias="outlet", description="tables [[outlet]]"
    )


@dataclass(frozen=True, slots=True)
class Settings:
    """Settings that can be used, and what is odd about them all the same."""

    path: Path
    service: Service
    judgement: Judgement
    model: Model
    sources: tuple[Source, ...]
    outlets: tuple[Outlet, ...]
    warnings: tuple[str, ...] = ()
