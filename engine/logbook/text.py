"""Text from files, headers and keyboards is hostile until it has been through here."""

from __future__ import annotations

import unicodedata

NAME_LENGTH = 80
NOTE_LENGTH = 10_000

# Cc, Cf, Cs: control characters, invisible format marks (bidi, zero width), lone surrogates.
# Zl, Zp: the line separators that some terminals and parsers take for a new line.
_UNSAFE = frozenset({"Cc", "Cf", "Cs", "Zl", "Zp"})


def _is_unsafe(character: str) -> bool:
    return unicodedata.category(character) in _UNSAFE


def visible(text: str) -> str:
    r"""Return the text with everything a terminal could act on shown as an escape (``\x1b``)."""
    return "".join(
        character.encode("unicode_escape", "surrogatepass").decode("ascii")
        if _is_unsafe(character)
        else character
        for character in text
    )


def clean_name(text: str) -> str:
    """Return a name unchanged, or raise ValueError when it can't be shown safely on one line."""
    if any(_is_unsafe(character) for character in text):
        raise ValueError(f"'{visible(text)[:60]}', expected no control or invisible characters")
    if len(text) > NAME_LENGTH:
        raise ValueError(f"{len(text)} characters, expected at most {NAME_LENGTH}")
    if text != text.strip():
        raise ValueError(f"'{text}', expected no blanks at either end")
    return text


def one_line(text: str, length: int = NOTE_LENGTH) -> str:
    """Return text fit for one line of screen or log: line ends as blanks, the unsafe escaped."""
    return visible(" ".join(text.split()))[:length]
