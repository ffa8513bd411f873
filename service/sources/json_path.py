"""JSONPath of RFC 9535, by a library: nodes of a value, and why a path has none."""

from collections.abc import Iterator
from functools import lru_cache

from jsonpath import JSONPath, JSONPathEnvironment, JSONPathError
from jsonpath.selectors import IndexSelector, NameSelector

from service.sources.errors import UnusablePath

_ENVIRONMENT = JSONPathEnvironment(strict=True)


@lru_cache(maxsize=512)
def compile_path(path: str) -> JSONPath:
    """The path, ready for use.

    Raises
    ------
    UnusablePath
        If the text is no JSONPath.
    """
    try:
        compiled = _ENVIRONMENT.compile(path)
    except JSONPathError as error:
        raise UnusablePath(path, str(error.message)) from None
    except RecursionError:
        raise UnusablePath(path, "it is nested too deeply") from None
    if not isinstance(compiled, JSONPath):
        raise UnusablePath(path, "it joins several paths")
    return compiled


def nodes(path: JSONPath, value: object) -> list[object]:
    """The values that the path has in a JSON value.

    The library would parse a bare text as a document, so scalars are answered here.
    """
    if isinstance(value, dict | list):
        return path.findall(value)
    return [value] if not path.segments else []


def fits(path: JSONPath, value: object) -> bool:
    """Whether a path without nodes belongs to this value all the same, since its list is only empty.

    `$.data[*]` fits {"data": []} and {"data": null}; it does not fit {"items": [...]}.
    """
    return all(_goes_on(path, steps, found) for steps, found in _longest_start(path, value))


def _longest_start(path: JSONPath, value: object) -> Iterator[tuple[int, list[object]]]:
    for steps in range(len(path.segments), -1, -1):
        start = JSONPath(env=_ENVIRONMENT, segments=path.segments[:steps])
        found = nodes(start, value)
        if found:
            yield steps, found
            return


def _goes_on(path: JSONPath, steps: int, found: list[object]) -> bool:
    if steps == len(path.segments):
        return True
    selectors = path.segments[steps].selectors
    if any(isinstance(selector, NameSelector | IndexSelector) for selector in selectors):
        return False
    return all(node is None or isinstance(node, dict | list) for node in found)
