"""Why a document cannot be used at all. Each error writes its own sentence, without any secret."""


class SourceUnreadable(Exception):
    """The document as a whole cannot be read; nothing of it is used."""

    def __init__(self, source: str, why: str) -> None:
        self.source, self.why = source, why
        super().__init__(f'Source "{source}" could not be read: {why}')


class MissingDriver(SourceUnreadable):
    """The Python package that speaks to this kind of database is not installed."""

    def __init__(self, source: str, module: str) -> None:
        self.module = module
        super().__init__(
            source,
            f'its database needs the Python package "{module}", which is not installed; '
            "install it into the environment that knickpoint runs in.",
        )


class UnusablePath(ValueError):
    """A text that is no JSONPath of RFC 9535."""

    def __init__(self, path: str, why: str) -> None:
        self.path, self.why = path, why
        super().__init__(f'"{path}" is no JSONPath of RFC 9535 ({why}); one looks like $.data[*].count.')
