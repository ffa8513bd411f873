"""A text that never shows itself."""

from typing import Any, NoReturn

from pydantic import GetCoreSchemaHandler
from pydantic_core import core_schema

from config.errors import SecretNotRead

MASK = "(secret)"


class Secret:
    """A text that only `reveal` gives away: not print, not repr, not a dump, not a pickle."""

    __slots__ = ("__origin", "__text")

    def __init__(self, text: str | None, origin: str = "The secret") -> None:
        self.__text, self.__origin = text, origin

    @property
    def is_read(self) -> bool:
        """Whether it was looked up: commands that need no secret leave it where it is."""
        return self.__text is not None

    def reveal(self) -> str:
        """The text itself. Whoever calls this must keep it out of logs, errors and the database.

        Raises
        ------
        SecretNotRead
            If the settings were read without their secrets.
        """
        if self.__text is None:
            raise SecretNotRead(self.__origin)
        return self.__text

    def __repr__(self) -> str:
        return f"Secret({MASK})"

    def __str__(self) -> str:
        return MASK

    def __eq__(self, other: object) -> bool:
        return self.__text == other.__text if isinstance(other, Secret) else NotImplemented

    def __hash__(self) -> int:
        return hash(self.__text)

    def __copy__(self) -> "Secret":
        return self

    def __deepcopy__(self, memo: dict[int, object]) -> "Secret":
        return self

    def __reduce_ex__(self, protocol: object) -> NoReturn:
        raise TypeError("A secret is never written down.")

    @classmethod
    def __get_pydantic_core_schema__(cls, source: type[Any], handler: GetCoreSchemaHandler) -> Any:
        """Only a secret is a secret; in every dump the mask stands for it."""
        return core_schema.is_instance_schema(
            cls, serialization=core_schema.plain_serializer_function_ser_schema(str)
        )


def reveal(value: str | Secret) -> str:
    """A text that may be a secret."""
    return value.reveal() if isinstance(value, Secret) else value
