"""Changing the logbook: nothing else moves, faults and crashes leave the old file as it was."""

from __future__ import annotations

import os
import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from engine.errors import LogbookFaults, NotNow
from engine.logbook import edit, load_logbook
from engine.logbook.edit import add_target, change_target, import_file, put_back, standing
from engine.logbook.fields import FIELDS, typed_field, typed_place
from tests.engine.logbook_files import TARGETS, written

COMMENTED = TARGETS.replace(
    'priority = 5\nexposures = [\n    { filter = "B", seconds = 90, count = 5 },',
    'priority = 5  # asked for by "R." # twice\n'
    'exposures = [  # first blue\n    { filter = "B", seconds = 90, count = 5 }, # = [not a table]',
)
ODD = """\
# all in one
target = [ { name = "P", ra = 10.0, dec = -20.0, exposures = [{ filter = "B", seconds = 9, count = 1 }] },
  { name = 'Q', ra = "01:00:00", dec = "-20:00:00", priority = 2, exposures = [ # in V
    { filter = "V", seconds = 9, count = 1 } ] } ]  # no more
"""  # noqa: E501
NEW = {
    "name": "Nova",
    "ra": "10:00:00",
    "dec": -30.5,
    "exposures": [{"filter": "V", "seconds": 60.0, "count": 5}],
}
VALUES: dict[str, Any] = {
    "priority": st.integers(1, 5),
    "magnitude": st.one_of(st.none(), st.floats(-30, 40)),
    "name": st.text("abc '\"#[]=\\{}é,.", min_size=1, max_size=12).filter(
        lambda text: text == text.strip()
    ),
    "ra": st.one_of(st.floats(0, 359.9), st.just("12:34:56.7")),
    "exposures": st.lists(
        st.fixed_dictionaries(
            {
                "filter": st.sampled_from("BV"),
                "seconds": st.floats(1, 1000),
                "count": st.integers(1, 9),
            }
        ),
        min_size=1,
        max_size=4,
    ),
    "windows": st.one_of(st.none(), st.just([list(tomllib.loads(
        "w = [2027-03-14T11:00:00Z, 2027-03-14T12:20:00Z]")["w"])])),
    "maximum_airmass": st.one_of(st.none(), st.floats(1, 40)),
}  # fmt: skip


def files_in(folder: Path) -> dict[str, bytes]:
    """Return every file of a folder, hidden ones too."""
    return {
        str(each.relative_to(folder)): each.read_bytes()
        for each in folder.rglob("*")
        if each.is_file()
    }


def comments_of(text: str) -> list[str]:
    """Return the comments of the texts above, by eye: none of their strings holds a hash."""
    return sorted(line[line.index("#") :] for line in text.splitlines() if "#" in line)


def test_an_added_target_is_in_the_logbook_and_all_else_is_as_it_was(tmp_path: Path) -> None:
    """It stands in a file of its own; a second one behind it leaves the first one's bytes."""
    folder = written(tmp_path)
    before = files_in(folder)
    add_target(folder, NEW)
    first = (folder / "targets" / "added.toml").read_bytes()
    change = add_target(folder, {**NEW, "name": "Nova 2", "programme": "Clusters"})
    assert change.after.startswith(first)
    assert {k: v for k, v in files_in(folder).items() if k in before} == before
    names = [each.name for each in load_logbook(folder).targets]
    assert names == ["M 67", "SA 98", "Nova", "Nova 2"]
    assert change.logbook == load_logbook(folder)


@pytest.mark.parametrize("ends", ["\n", "\r\n"])
@pytest.mark.parametrize("mark", [b"", b"\xef\xbb\xbf"])
def test_a_change_touches_its_value_alone(tmp_path: Path, ends: str, mark: bytes) -> None:
    """By eye: the line of the key is another, every other byte and comment the same."""
    data = mark + COMMENTED.replace("\n", ends).encode()
    folder = written(tmp_path, {"targets.toml": data})
    change_target(folder, "M 67", "priority", 2)
    path = folder / "targets.toml"
    assert path.read_bytes() == data.replace(b"priority = 5", b"priority = 2")
    change_target(folder, "M 67", "priority", None)
    assert path.read_bytes() == data.replace(b"priority = 5  #", b"  #")
    change_target(folder, "SA 98", "magnitude", 9.5)
    put_in = f'role = "standard"{ends}magnitude = 9.5{ends}'.encode()
    assert put_in in path.read_bytes()


@pytest.mark.parametrize("text", [COMMENTED, ODD], ids=["tables", "all in one"])
@settings(deadline=None, max_examples=60, suppress_health_check=list(HealthCheck))
@given(data=st.data())
def test_whatever_is_changed_nothing_else_is(
    tmp_path_factory: pytest.TempPathFactory, text: str, data: st.DataObject
) -> None:
    """Random changes one after the other: each is there, other targets equal, comments kept."""
    folder = written(tmp_path_factory.mktemp("book"), {"targets.toml": text})
    path = folder / "targets.toml"
    for _ in range(data.draw(st.integers(1, 4))):
        before = path.read_bytes()
        tables = tomllib.loads(before.decode())["target"]
        place = data.draw(st.integers(0, len(tables) - 1))
        key = data.draw(st.sampled_from(sorted(VALUES)))
        value = data.draw(VALUES[key])
        if key == "name":
            value = f"{value}{place}"
        try:
            change_target(folder, tables[place]["name"], key, value)
        except (LogbookFaults, NotNow):
            assert path.read_bytes() == before
            continue
        after = path.read_text(encoding="utf-8")
        found = tomllib.loads(after)["target"]
        meant = tables[place] | {key: value}
        if value is None:
            del meant[key]
        assert found[place] == meant
        del found[place], tables[place]
        assert found == tables
        for comment in comments_of(text):
            assert comment in after


def test_a_key_put_into_an_inline_table_is_refused_not_guessed(tmp_path: Path) -> None:
    """There is no line for it: the file stays, and the reason is said."""
    folder = written(tmp_path, {"targets.toml": ODD})
    before = files_in(folder)
    with pytest.raises(NotNow, match="change it in the file"):
        change_target(folder, "P", "priority", 4)
    assert files_in(folder) == before
    change_target(folder, "Q", "priority", 4)
    assert "priority = 4, exposures = [ # in V" in (folder / "targets.toml").read_text()


@pytest.mark.parametrize(
    ("key", "value", "said"),
    [
        ("priority", 9, "expected"),
        ("name", "SA 98", "expected each name once"),
        ("programme", "Nebulae", "expected one of 'Clusters'"),
        ("exposures", [{"filter": "X", "seconds": 1.0, "count": 1}], "not in the wheel"),
        ("windows", "tomorrow", "expected a list"),
    ],
)
def test_a_fault_is_shown_and_nothing_is_written(
    tmp_path: Path, key: str, value: object, said: str
) -> None:
    """The loader's own words, for a change and for an added target alike."""
    folder = written(tmp_path)
    before = files_in(folder)
    with pytest.raises(LogbookFaults, match=said):
        change_target(folder, "M 67", key, value)
    with pytest.raises(LogbookFaults, match=said):
        add_target(folder, {**NEW, key: value})
    assert files_in(folder) == before


@pytest.mark.parametrize("call", ["fsync", "replace", "fchmod"])
@pytest.mark.parametrize("failure", [OSError(28, "No space left on device"), KeyboardInterrupt()])
def test_a_failure_at_any_call_leaves_the_old_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, call: str, failure: BaseException
) -> None:
    """A full disk and a sudden end at each call that touches the disk."""
    folder = written(tmp_path)
    before = files_in(folder)

    def fail(*_: object) -> None:
        raise failure

    monkeypatch.setattr(os, call, fail)
    with pytest.raises((NotNow, KeyboardInterrupt)):
        change_target(folder, "M 67", "priority", 1)
    monkeypatch.undo()
    assert files_in(folder) == before


def test_a_process_killed_anywhere_leaves_old_or_new(tmp_path: Path) -> None:
    """Ended without a word before each call in turn: the file is whole, and a hidden one no target.

    The process is a child that ends by `os._exit` in place of the call.
    """
    for call in ("fsync", "fchmod", "replace"):
        folder = written(tmp_path / call)
        before = (folder / "targets.toml").read_bytes()
        child = os.fork()
        if child == 0:
            setattr(os, call, lambda *_: os._exit(0))
            change_target(folder, "M 67", "priority", 1)
            os._exit(1)
        assert os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]) == 0
        assert (folder / "targets.toml").read_bytes() == before
        assert len(load_logbook(folder).targets) == 2


def test_a_file_changed_meanwhile_is_not_written_over(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Somebody saves the file from an editor while the change is being checked."""
    folder = written(tmp_path)
    path = folder / "targets.toml"
    theirs = TARGETS + "# saved from an editor\n"

    def load_slowly(*given: Any) -> Any:
        path.write_text(theirs)
        return load_logbook(*given)

    monkeypatch.setattr(edit, "load_logbook", load_slowly)
    with pytest.raises(NotNow, match="changed by somebody else"):
        change_target(folder, "M 67", "priority", 1)
    assert path.read_text() == theirs


CSV = "name,ra,dec,exposures\nT 1,10:00:00,-30:00:00,V:60x5\nT 2,150.5,-31,B:60x5\n"


def test_an_import_is_checked_whole_then_copied_byte_for_byte(tmp_path: Path) -> None:
    """All faults at once, called by the file that was typed; then the sound one."""
    folder = written(tmp_path / "book")
    source = tmp_path / "mine.csv"
    source.write_text(CSV.replace("V:60x5", "Z:60x5").replace("-31", "-131"))
    before = files_in(folder)
    with pytest.raises(LogbookFaults) as found:
        import_file(folder, source)
    assert {each.line for each in found.value.faults} == {2, 3}
    assert {each.path for each in found.value.faults} == {source}
    assert files_in(folder) == before
    source.write_text(CSV)
    change = import_file(folder, source)
    assert (folder / "targets" / "mine.csv").read_text() == CSV
    assert [each.name for each in change.logbook.targets][-2:] == ["T 1", "T 2"]
    with pytest.raises(NotNow, match="already"):
        import_file(folder, source)
    with pytest.raises(NotNow, match=r"row of mine\.csv, line 3"):
        change_target(folder, "T 2", "priority", 1)


def test_a_change_is_put_back_unless_the_file_was_touched(tmp_path: Path) -> None:
    """Undo gives the very bytes, or takes the new file away; not over somebody's own change."""
    folder = written(tmp_path)
    before = files_in(folder)
    change = add_target(folder, NEW)
    put_back(folder, change)
    assert files_in(folder) == before
    change = change_target(folder, "M 67", "priority", 1)
    put_back(folder, change)
    assert files_in(folder) == before
    change = change_target(folder, "M 67", "priority", 1)
    (folder / "targets.toml").write_text(TARGETS)
    with pytest.raises(NotNow, match="changed since"):
        put_back(folder, change)


def test_where_a_target_stands(tmp_path: Path) -> None:
    """File and line, in TOML and in a table."""
    folder = written(tmp_path, {"targets/x.csv": CSV})
    found = standing(folder, "SA 98")
    assert found is not None
    assert (found.path.name, found.place, found.line) == ("targets.toml", 1, 18)
    found = standing(folder, "T 2")
    assert found is not None
    assert (found.path.name, found.place, found.line) == ("x.csv", 1, 3)
    assert standing(folder, "T 3") is None


def test_fields_are_read_as_they_are_typed(tmp_path: Path) -> None:
    """Every field takes what it should and says what it expected; nothing takes a key away."""
    book = load_logbook(written(tmp_path))
    assert typed_field("name", " NGC  1 ", book) == "NGC 1"
    assert typed_field("name", "47", book) == "47"
    assert typed_field("priority", "4", book) == 4
    assert typed_field("magnitude", "", book) is None
    assert typed_field("ra", "8 51 18", book) == "8:51:18"
    assert typed_field("greatest_gap_min", "30", book) == 30
    assert typed_field("visits", "3", book) == 3
    assert typed_field("each_night", "true", book) is True
    assert typed_field("exposures", "V:60x5", book) == [
        {"filter": "V", "seconds": 60.0, "count": 5}
    ]
    wrong = {
        "name": "", "ra": "25:00:00", "dec": "95", "exposures": "X:60x5", "priority": "9",
        "programme": "Cluster", "role": "friend", "windows": "now", "magnitude": "bright",
        "visits": "0", "maximum_airmass": "nan", "pm_ra_mas_per_yr": "x", "each_night": "perhaps",
    }  # fmt: skip
    assert set(wrong) <= set(FIELDS)
    for key, text in wrong.items():
        with pytest.raises(ValueError, match=r"expected|nearest"):
            typed_field(key, text, book)


@pytest.mark.parametrize(
    ("text", "place"),
    [
        ("08:51:18 +11:48:00", ("08:51:18", "+11:48:00")),
        ("08 51 18.2, -11 48", ("08:51:18.2", "-11:48")),
        ("132.825 -11.8", (132.825, -11.8)),
    ],
)
def test_a_place_is_typed_in_one_line(text: str, place: tuple[object, object]) -> None:
    """Sexagesimal or degrees, blanks or colons."""
    assert typed_place(text) == place


@pytest.mark.parametrize("text", ["", "08:51:18", "8:51:18 11:48:00", "25:00:00 +1:00:00", "x +y"])
def test_a_place_that_is_none_says_what_was_expected(text: str) -> None:
    """No guessing of signs."""
    with pytest.raises(ValueError, match="expected"):
        typed_place(text)
