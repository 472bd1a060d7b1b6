"""Changing the logbook while its night runs: the file, the log's word for it, a new order."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from engine.errors import NotNow
from engine.log import Amendment, Event, Note, TargetAdded
from engine.logbook import edit, load_logbook
from engine.logbook.edit import Change
from engine.watch.listing import added_event
from engine.watch.watch import Watch

Done = tuple[Change, Event]


def add(watch: Watch, values: Mapping[str, object]) -> Done:
    """Add a target to the logbook; the order is made anew with it.

    LogbookFaults when it can't be one: nothing is written then.
    """
    _may_write(watch)
    change = edit.add_target(_folder(watch), values)
    name = str(values["name"])
    target = next(each for each in change.logbook.targets if each.name == name)
    event = watch.submit(added_event(target), because=f"{name} came in")
    watch.renew(change.logbook, f"{name} came in")
    return change, event


def change(watch: Watch, name: str, key: str, value: object, said: str) -> Done:
    """Give a key of a target another value (None takes it away); ``said`` says so in the log."""
    _may_write(watch)
    made = edit.change_target(_folder(watch), name, key, value)
    event = watch.submit(Note(text=f"logbook: {said}, in {made.path.name}", target=name))
    watch.renew(made.logbook, f"{name} was edited")
    return made, event


def take_in(watch: Watch, source: Path) -> Done:
    """Copy a file of targets into the logbook, once all of it is sound."""
    _may_write(watch)
    had = {each.name for each in watch.planner.logbook.targets}
    made = edit.import_file(_folder(watch), source)
    names = [each.name for each in made.logbook.targets if each.name not in had]
    text = f"logbook: {made.path.name} came in, targets {len(names)}: {', '.join(names)}"
    event = watch.submit(Note(text=text[:2000]))
    watch.renew(made.logbook, f"{made.path.name} came in")
    return made, event


def put_back(watch: Watch, done: Done) -> Event:
    """Undo a change of the logbook: its file as it was, and its entry in the log withdrawn."""
    _may_write(watch)
    made, event = done
    logbook = edit.put_back(_folder(watch), made)
    why = "put back by the observer"
    taken = watch.submit(Amendment(of=event.n, withdrawn=True, why=why))
    watch.renew(logbook, "the logbook was put back")
    return taken


def reload(watch: Watch) -> Event:
    """Read the logbook's files anew, as somebody may have changed them; LogbookFaults as ever."""
    logbook = load_logbook(_folder(watch))
    before = {each.name: each for each in watch.planner.logbook.targets}
    after = {each.name: each for each in logbook.targets}
    added = {event.name for event in watch.state.added if isinstance(event, TargetAdded)}
    gone = [name for name in before if name not in after and name not in added]
    changed = [name for name in after if name in before and after[name] != before[name]]
    new = [name for name in after if name not in before]
    parts = (("new", new), ("changed", changed), ("gone", gone))
    said = "; ".join(f"{word}: {', '.join(names)}" for word, names in parts if names)
    if not said and logbook.observatory == watch.planner.logbook.observatory:
        raise NotNow("the logbook's files say what they said")
    event = watch.submit(
        Note(text=f"logbook read anew; {said or 'the observatory changed'}"[:2000])
    )
    watch.renew(logbook, "the logbook was read anew")
    return event


def _folder(watch: Watch) -> Path:
    return watch.planner.logbook.folder


def _may_write(watch: Watch) -> None:
    if watch.is_read_only:
        raise NotNow("this console looks on; only the one that runs the night writes")
