"""Outlets: where alerts go."""

from typing import Literal

from pydantic import Field

from config.base import Block
from config.places import SecretAddress, SigningSecret
from config.values import Deadline, Name, Values


class WebhookOutlet(Block):
    """A signed POST to an address. `slates` None means all of them."""

    name: Name
    kind: Literal["webhook"]
    address: SecretAddress
    secret: SigningSecret
    slates: Values | None = None
    deadline: Deadline = Field(default="15s")  # type: ignore[assignment]


# A second kind makes this a union that `kind` tells apart, as in sources.py.
Outlet = WebhookOutlet
