"""The Link header of RFC 8288, as far as paging needs it."""

import re

_TARGET = re.compile(r"[\s,]*<([^>]*)>")
_PARAMETER = re.compile(r'\s*;\s*([^\s=;,"<>]+)(?:\s*=\s*(?:"((?:[^"\\]|\\.)*)"|([^\s;,"]*)))?')
_END = re.compile(r"\s*(?:;\s*)*(?:,|$)")
_NOTHING_MORE = re.compile(r"[\s,]*$")


def next_reference(header: str) -> str | None:
    """The target of the first link with rel="next" whose context is the page itself; None without one.

    Raises
    ------
    ValueError
        If the header cannot be taken apart: a link to a next page may be lost in it.
    """
    position = 0
    while not _NOTHING_MORE.match(header, position):
        target, parameters, position = _link(header, position)
        if "next" in parameters.get("rel", "").lower().split() and "anchor" not in parameters:
            return target
    return None


def _link(header: str, position: int) -> tuple[str, dict[str, str], int]:
    target = _TARGET.match(header, position)
    if target is None:
        raise ValueError("no target in angle brackets where a link should begin")
    position = target.end()
    parameters: dict[str, str] = {}
    while parameter := _PARAMETER.match(header, position):
        name, quoted, bare = parameter.groups()
        value = re.sub(r"\\(.)", r"\1", quoted) if quoted is not None else bare or ""
        # Of a repeated rel only the first counts (section 3.3).
        parameters.setdefault(name.lower(), value)
        position = parameter.end()
    end = _END.match(header, position)
    if end is None:
        raise ValueError("something other than parameters after a link's target")
    return target.group(1), parameters, end.end()
