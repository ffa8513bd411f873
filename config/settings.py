"""The whole settings file."""

from typing import Annotated, Literal

from pydantic import Field

from config.base import Block
from config.judging import Judgement, Model
from config.outlets import Outlet
from config.places import SecretAddress
from config.sources import Source
from config.values import Stop, PathHere, Zone

LONGEST_LIST = 1000


class Service(Block):
    """The running program."""

    database: PathHere = Field(default="knickpoint.sqlite")  # type: ignore[assignment]
    zone: Zone = Field(default="UTC")  # type: ignore[assignment]
    good_rounds_address: SecretAddress | None = None
    log_format: Literal["text", "json"] = "text"
    log_level: Literal["debug", "info", "warning", "error"] = "info"
    stop_within: Stop = Field(default="30s")  # type: ignore[assignment]


class Settings(Block):
    """What a person wrote, checked; every path in it is complete and every length of time a timedelta."""

    service: Service = Field(default_factory=dict)  # type: ignore[arg-type]
    judgement: Judgement = Field(default_factory=Judgement)
    model: Model = Field(default_factory=Model)
    sources: Annotated[tuple[Source, ...], Field(alias="source", strict=False, max_length=LONGEST_LIST)] = ()
    outlets: Annotated[tuple[Outlet, ...], Field(alias="outlet", strict=False, max_length=LONGEST_LIST)] = ()
