"""The errors that end a command, one class per cause, and how names and values are shown in them."""

from __future__ import annotations

import difflib
from collections.abc import Iterable


class BadInputError(Exception):
    """Something the user can put right: the message names file, key, rule and value, in one line (exit status 2)."""


def closest(name: str, names: Iterable[str]) -> str:
    """How a misspelt name is answered: " (did you mean 'width'?)", or "" when nothing comes close."""
    by_lower = {candidate.lower(): candidate for candidate in names}
    found = difflib.get_close_matches(name.lower(), by_lower, n=1, cutoff=0.5)
    return f" (did you mean {by_lower[found[0]]!r}?)" if found else ""


def listed(names: Iterable[str]) -> str:
    """Names as they stand in a message: 'a', 'b', 'c'."""
    return ", ".join(repr(name) for name in names)


def shown(value: object, limit: int = 60) -> str:
    """A value from a scenario as it stands in a message: the way TOML writes it, cut off when long."""
    if isinstance(value, bool):
        text = "true" if value else "false"
    elif isinstance(value, str):
        text = '"' + value + '"'
    elif isinstance(value, dict):
        text = "{" + ", ".join(f"{key} = {shown(item)}" for key, item in value.items()) + "}"
    else:
        text = str(value)
    return text if len(text) <= limit else text[: limit - 3] + "..."


def one_line(text: str) -> str:
    """The text with line ends and other control characters escaped, so that a message stays one line."""
    return "".join(character if character.isprintable() else _escaped(character) for character in text)


def _escaped(character: str) -> str:
    return character.encode("unicode_escape", "backslashreplace").decode("ascii")


def came_of_interrupt(error: BaseException) -> bool:
    """Whether an error arose while an interrupt was on its way out.

    An interrupt that arrives while a lock is being taken makes the lock's own clean-up fail, and hides behind that.
    """
    seen: BaseException | None = error
    while seen is not None:
        if isinstance(seen, KeyboardInterrupt):
            return True
        seen = seen.__cause__ or seen.__context__
    return False
