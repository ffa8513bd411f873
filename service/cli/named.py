"""Sources and outlets by the names that the settings give them."""

import os

from service.cli.errors import UnknownName
from service.cli.options import Given
from service.outlets.outlet import Outlet
from service.round.plans import RoundPlan
from service.wiring import wire


def source_named(given: Given, name: str) -> RoundPlan:
    """What a round of that source needs.

    Raises
    ------
    UnknownName
        If the settings name no such source.
    """
    plans = wire(given.settings, os.environ).rounds
    for plan in plans:
        if plan.name == name:
            return plan
    raise UnknownName("source", name, [plan.name for plan in plans])


def outlet_named(given: Given, name: str) -> Outlet:
    """The outlet of that name.

    Raises
    ------
    UnknownName
        If the settings name no such outlet.
    """
    outlets = wire(given.settings, os.environ).outlets
    for outlet in outlets:
        if outlet.name == name:
            return outlet
    raise UnknownName("outlet", name, [outlet.name for outlet in outlets])
