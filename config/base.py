"""What all blocks of the settings have in common."""

from pydantic import BaseModel, ConfigDict


class Block(BaseModel):
    """A table of the settings: read only, nothing unknown in it, nothing turned into another kind.

    Defaults are checked as well, since relative paths are completed there. Inputs are kept out of errors.
    """

    model_config = ConfigDict(
        frozen=True,
        extra="forbid",
        strict=True,
        validate_default=True,
        hide_input_in_errors=True,
        arbitrary_types_allowed=True,
    )
