"""The keys in force: the table's own, and those the observer has put in their place.

``keys.toml`` in the platform's folder for settings says which action has which keys:

    [keys]
    stop = "f10"
    note = ["n", "ctrl+n"]

The actions' names are in the table (`tui.console.actions`) and in README. What is wrong in the file
is told, a line each, and the rest of it holds: at two in the morning a console with a wrong key is
better than none.
"""

from __future__ import annotations

import difflib
import re
import tomllib
from collections.abc import Iterable
from dataclasses import dataclass, replace
from pathlib import Path

import platformdirs

from tui.console.actions import ACTIONS, MOVES, Action, cap

# What these do is not in the table: they can't be given away.
FIXED = {"escape": "puts things aside", "ctrl+p": "opens the palette", "ctrl+c": "interrupts"}
_NAMED = re.compile(
    r"(?:(?:ctrl|shift|alt)\+)*(?:f(?:[1-9]|1[0-9]|2[0-4])|space|enter|tab|backspace|delete|insert"
    r"|home|end|pageup|pagedown|up|down|left|right|[a-z0-9])\Z"
)
EXPECTED = 'a key such as "s", "S", "?", "space", "f10" or "ctrl+s", or a list of them'


@dataclass(frozen=True, slots=True)
class Keys:
    """Every action with its keys in force, and what was wrong with those that were asked for."""

    actions: tuple[Action, ...] = ACTIONS
    faults: tuple[str, ...] = ()

    def action_of(self, key: str, character: str | None = None) -> str | None:
        """Return the name of the action that a key does, by the key's name or what it types."""
        for each in self.actions:
            if key in each.keys or (character and character in each.keys):
                return each.name
        return None

    def cap_of(self, name: str) -> str:
        """Return what is printed on the first key of an action; nothing where it has none."""
        keys = next(each.keys for each in self.actions if each.name == name)
        return cap(keys[0]) if keys else ""

    def footer(self) -> list[Action]:
        """Return the actions of the footer in its order, those that have a key."""
        shown = [each for each in self.actions if each.footer and each.keys]
        return sorted(shown, key=lambda action: action.footer)


def keys_path() -> Path:
    """Return where the observer's own keys stand."""
    return platformdirs.user_config_path("warmroom") / "keys.toml"


def load_keys(path: Path | None = None) -> Keys:
    """Return the keys in force; without a file those of the table."""
    path = path or keys_path()
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        return Keys()
    except (OSError, UnicodeDecodeError) as error:
        return Keys(faults=(f"{path}:1: {error}; the usual keys are in force",))
    try:
        wanted = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        found = re.search(r"line (\d+)", str(error))
        line = found[1] if found else 1
        return Keys(faults=(f"{path}:{line}: {error}; the usual keys are in force",))
    return _rebound(path, text, wanted)


def _rebound(path: Path, text: str, wanted: dict[str, object]) -> Keys:
    faults = [
        _fault(path, text, name, "unknown, expected [keys]") for name in wanted if name != "keys"
    ]
    table = wanted.get("keys", {})
    if not isinstance(table, dict):
        return Keys(faults=(*faults, _fault(path, text, "keys", "expected a table [keys]")))
    names = [each.name for each in ACTIONS]
    own: dict[str, tuple[str, ...]] = {}
    owner: dict[str, str] = {}
    for name, asked in table.items():
        if name not in names:
            near = difflib.get_close_matches(name, names, n=1)
            hint = f", nearest is {near[0]}" if near else ""
            faults.append(_fault(path, text, name, f"unknown action{hint}"))
            continue
        keys = [asked] if isinstance(asked, str) else asked
        if not isinstance(keys, list) or not keys:
            faults.append(_fault(path, text, name, f"{asked!r}, expected {EXPECTED}"))
            continue
        good = []
        for key in keys:
            what = _wrong(key, owner)
            if what:
                faults.append(_fault(path, text, name, what))
            else:
                good.append(key)
                owner[key] = name
        if good:
            own[name] = tuple(good)
    actions = tuple(_with_keys(each, own, owner) for each in ACTIONS)
    faults += [
        _fault(path, text, owner[each.keys[0]], f"takes the only key of {each.name}; ctrl+p has it")
        for each, now in zip(ACTIONS, actions, strict=True)
        if not now.keys
    ]
    return Keys(actions, tuple(faults))


def _with_keys(action: Action, own: dict[str, tuple[str, ...]], owner: dict[str, str]) -> Action:
    """Return an action with its own keys, or with those of its usual ones nobody else has."""
    usual = tuple(key for key in action.keys if owner.get(key, action.name) == action.name)
    return replace(action, keys=own.get(action.name, usual))


def _wrong(key: object, owner: dict[str, str]) -> str | None:
    """Return what is wrong with a key that was asked for; None when nothing is."""
    if not isinstance(key, str) or not (_NAMED.match(key) or (len(key) == 1 and key.isprintable())):
        return f"{key!r}, expected {EXPECTED}"
    if key in FIXED:
        return f"{key!r} {FIXED[key]}, expected another key"
    if key in MOVES:
        return f"{key!r} moves the cursor, expected another key"
    if key in owner:
        return f"{key!r} is the key of {owner[key]} already, expected another one"
    return None


def _fault(path: Path, text: str, name: str, what: str) -> str:
    """Return a fault as ``path:line: key: what``."""
    lines: Iterable[tuple[int, str]] = enumerate(text.splitlines(), start=1)
    wanted = re.compile(rf'\s*\[?"?{re.escape(name)}"?\s*[=\]]')
    line = next((number for number, each in lines if wanted.match(each)), 1)
    return f"{path}:{line}: {name}: {what}"
