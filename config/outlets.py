"""Where alerts go."""

import datetime
from typing import Annotated, Literal

from pydantic import Field, Strict

from config.addresses import SecretAddress, SigningSecret
from config.durations import Deadline
from config.part import Part
from config.words import Name, Slate

Slates = Annotated[
    tuple[Slate, ...],
    Strict(False),
    Field(min_length=1, description="a list of one or more slates in quotes"),
]


class WebhookOutlet(Part):
    """A signed POST to an address. `slates` None means all, and streams without a slate too."""

    kind: Literal["webhook"] = Field(description='"webhook"')
    name: Name
    address: SecretAddress
    secret: SigningSecret
    slates: Slates | None = None
    deadline: Deadline = datetime.timedelta(seconds=15)


# A second kind joins by `chosen_by`, as in sources.py; a choice from one is none.
Outlet = WebhookOutlet
