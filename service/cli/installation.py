"""Which program this is: its version, and whether its packages are its own."""

from importlib import metadata
from importlib.util import find_spec
from pathlib import Path

import service
from service.cli.errors import MixedInstallation


def version() -> str:
    """The installed version."""
    try:
        return metadata.version("knickpoint")
    except metadata.PackageNotFoundError:
        return "(not installed)"


def require_own_packages() -> None:
    """Our package names are plain words, so a foreign package of that name must not be taken for ours.

    Raises
    ------
    MixedInstallation
        If one stands elsewhere than beside this package.
    """
    home = Path(service.__file__).resolve().parent.parent
    for package in ("config", "detectors", "storage"):
        spec = find_spec(package)
        found = Path(spec.origin).resolve() if spec and spec.origin else None
        if found is None or found.parent.parent != home:
            raise MixedInstallation(package, str(found or "nothing"))
