"""A first logbook: whatever sound answers are given, it is read without a fault."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.errors import LogbookFaults, WarmroomError
from engine.first_logbook import BANDS, QUESTIONS, first_logbook, write_first_logbook
from engine.light.photometry import zero_point_doubt
from engine.logbook import load_logbook

NAMES = st.text(st.characters(categories=["L", "N"], include_characters=" '\"\\-#="), min_size=1)
EXAMPLES = [question.example for question in QUESTIONS]


def read(texts: list[str]) -> list[dict[str, object]]:
    """Return what answers say."""
    return [question.read(text) for question, text in zip(QUESTIONS, texts, strict=True)]


def test_the_examples_make_a_sound_logbook(tmp_path: Path) -> None:
    """Enter, six times: what was said is in it, what was guessed says so."""
    folder = tmp_path / "new" / "nights"
    write_first_logbook(folder, first_logbook(read(EXAMPLES)))
    logbook = load_logbook(folder)
    assert logbook.observatory.site.latitude_deg == -31.27
    assert [each.name for each in logbook.observatory.filters] == ["B", "V", "R", "I"]
    assert logbook.targets[0].name == "M 67"
    text = (folder / "observatory.toml").read_text()
    assert "slew_deg_per_s = 2.0              # a guess" in text
    for each in logbook.observatory.filters:
        assert zero_point_doubt(each, logbook.observatory.telescope) is None


@settings(max_examples=60)
@given(
    NAMES,
    st.floats(-89, 89),
    st.integers(-11, 11),
    st.floats(0.05, 10),
    st.floats(0.1, 100),
    st.sampled_from(["german", "fork", "altazimuth"]),
    st.sets(st.sampled_from(sorted(BANDS)), min_size=1),
)
def test_any_sound_answers_make_a_sound_logbook(
    tmp_path_factory: pytest.TempPathFactory,
    name: str,
    latitude: float,
    zone: int,
    aperture: float,
    focal: float,
    mount: str,
    filters: set[str],
) -> None:
    """Names with quotes and signs in them too."""
    texts = [
        f"{name.strip() or 'x'}, {latitude}, {15 * zone}",
        f"100, Etc/GMT{-zone:+d}",
        f"{aperture}, {focal}, {mount}",
        "5.4, 1024, 1024",
        " ".join(filters),
        "A, 00:00:00, -00:30:00",
    ]
    folder = tmp_path_factory.mktemp("first") / "nights"
    write_first_logbook(folder, first_logbook(read(texts)))
    assert load_logbook(folder).targets[0].dec_deg == -0.5


@pytest.mark.parametrize(
    ("place", "text", "said"),
    [
        (0, "Ridge -31 149", "with commas between"),
        (0, "Ridge, -95, 149", "the latitude is '-95', expected a number from -90 to 90"),
        (1, "100, Atlantis", "'Atlantis' is no time zone"),
        (2, "0.8, 5.6, dobson", "expected german, fork or altazimuth"),
        (3, "nine, 10, 10", "the pixel is 'nine'"),
        (4, "B B", "expected each once"),
        (4, "Q", "expected each once"),
        (5, "M 67, 25:00:00, +11:48:00", "hours hh:mm:ss"),
    ],
)
def test_a_wrong_answer_says_what_was_expected(place: int, text: str, said: str) -> None:
    """In one line, without asking anything else again."""
    with pytest.raises(ValueError, match=said):
        QUESTIONS[place].read(text)


def test_answers_that_do_not_fit_together_leave_nothing_behind(tmp_path: Path) -> None:
    """A longitude with the wrong sign for its zone."""
    texts = ["Ridge, -31, -60", *EXAMPLES[1:]]
    with pytest.raises(LogbookFaults, match="timezone"):
        write_first_logbook(tmp_path, first_logbook(read(texts)))
    assert list(tmp_path.iterdir()) == []


def test_nothing_that_is_there_is_replaced(tmp_path: Path) -> None:
    """Not even a lonely targets.toml."""
    (tmp_path / "targets.toml").write_text("mine")
    with pytest.raises(WarmroomError, match="is there already"):
        write_first_logbook(tmp_path, first_logbook(read(EXAMPLES)))
    assert (tmp_path / "targets.toml").read_text() == "mine"
    assert not (tmp_path / "observatory.toml").exists()
