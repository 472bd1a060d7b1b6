"""The observer's own keys: what holds, what is told, and that everything shown follows."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.tui.trial import Trial, a_logbook, play
from tui.command import main
from tui.console.actions import ACTIONS, MOVES
from tui.console.foot import foot_keys
from tui.console.keys import FIXED, Keys, load_keys


def loaded(tmp_path: Path, text: str) -> Keys:
    """Return the keys in force with a file of one's own."""
    path = tmp_path / "keys.toml"
    path.write_text(text)
    return load_keys(path)


def test_without_a_file_the_keys_are_the_table_s(tmp_path: Path) -> None:
    """And nothing is told."""
    assert load_keys(tmp_path / "keys.toml") == Keys()
    assert Keys().action_of("question_mark") == "help"


def test_own_keys_take_the_place_of_the_usual_ones(tmp_path: Path) -> None:
    """By name or by what they type; the usual key of the action is free, others keep theirs."""
    keys = loaded(tmp_path, '[keys]\nstop = "f10"\nnote = ["N", "ctrl+n"]\nseeing = "!"\n')
    assert keys.faults == ()
    assert keys.action_of("f10") == "stop"
    assert keys.action_of("s") is None
    assert keys.action_of("N") == keys.action_of("ctrl+n") == "note"
    assert keys.action_of("exclamation_mark", "!") == "seeing"
    assert keys.action_of("space") == "go_on"
    assert ("f10", "stop") in foot_keys(keys)


def test_a_key_taken_from_another_action_is_told(tmp_path: Path) -> None:
    """That one has none left, but is still in the palette."""
    keys = loaded(tmp_path, '[keys]\nseeing = "s"\n')
    assert keys.action_of("s") == "seeing"
    (fault,) = keys.faults
    assert fault.endswith("keys.toml:2: seeing: takes the only key of stop; ctrl+p has it")
    assert all(key for key, _ in foot_keys(keys))


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ('[keys]\nstpo = "f10"\n', ":2: stpo: unknown action, nearest is stop"),
        ("[keys]\nstop = 5\n", ':2: stop: 5, expected a key such as "s"'),
        ("[keys]\nstop = []\n", ":2: stop: [], expected a key"),
        ('[keys]\nstop = "hyperdrive"\n', ":2: stop: 'hyperdrive', expected a key"),
        ('[keys]\nstop = "escape"\n', ":2: stop: 'escape', expected a key"),
        ('[keys]\nstop = "ctrl+p"\n', ":2: stop: 'ctrl+p' opens the palette"),
        ('[keys]\nstop = "j"\n', ":2: stop: 'j' moves the cursor"),
        ('[keys]\nstop = "f9"\nnote = "f9"\n', ":3: note: 'f9' is the key of stop already"),
        ('[colours]\nred = 1\n[keys]\nstop = "f9"\n', ":1: colours: unknown, expected [keys]"),
        ("[keys\n", "the usual keys are in force"),
        ('keys = "s"\n', ":1: keys: expected a table [keys]"),
    ],
)
def test_what_is_wrong_is_told_and_the_rest_holds(tmp_path: Path, text: str, said: str) -> None:
    """One line a fault, with its place; go_on always has its key."""
    keys = loaded(tmp_path, text)
    assert any(said in fault for fault in keys.faults), keys.faults
    assert keys.action_of("space") == "go_on"


@given(
    st.dictionaries(
        st.sampled_from([each.name for each in ACTIONS]),
        st.lists(st.sampled_from(["s", "f5", "x", "Q", "ctrl+e", "j", "escape", "?", "ö"])),
        max_size=8,
    )
)
def test_no_key_ever_does_two_things(
    tmp_path_factory: pytest.TempPathFactory, own: dict[str, list[str]]
) -> None:
    """Whatever is asked for: each key does one action, and what moves the cursor still does."""
    text = "[keys]\n" + "".join(f"{name} = {keys!r}\n" for name, keys in own.items())
    assert tomllib.loads(text)
    keys = loaded(tmp_path_factory.mktemp("own"), text)
    every = [key for each in keys.actions for key in each.keys]
    assert len(every) == len(set(every))
    assert not set(every) & (set(MOVES) | set(FIXED))


def test_the_console_takes_them(tmp_path: Path) -> None:
    """A key of one's own does what it says, the foot shows it."""
    keys = loaded(tmp_path, '[keys]\nnote = "f9"\nnonsense = "f8"\n')

    async def story(trial: Trial) -> None:
        trial.console.keys = keys
        trial.console.paint()
        assert "f9 note" in trial.text("foot")
        await trial.press("f9")
        await trial.type("my own key")
        assert trial.watch.state.notes[-1].text == "my own key"

    play(a_logbook(tmp_path / "nights"), story)


def test_the_command_prints_names_keys_and_the_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Status 2 when something in the file is wrong."""
    monkeypatch.setattr("tui.console.keys.keys_path", lambda: tmp_path / "keys.toml")
    assert main(["keys"]) == 0
    assert "go_on" in capsys.readouterr().out
    (tmp_path / "keys.toml").write_text('[keys]\nstpo = "f1"\n')
    assert main(["keys"]) == 2
    assert "nearest is stop" in capsys.readouterr().err
