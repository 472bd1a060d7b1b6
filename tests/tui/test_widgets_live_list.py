"""The live list: the cursor keeps to its key, only changed rows are sent, columns give way."""

from __future__ import annotations

import asyncio
from collections.abc import Awaitable, Callable

import pytest
from textual.app import App, ComposeResult
from textual.geometry import Region
from textual.pilot import Pilot

from tui.look import LOOKS
from tui.paint.spans import Span
from tui.widgets import Column, LiveList, Row

COLUMNS = (
    Column("target", 10),
    Column("alt", 5, right=True),
    Column("air", 5, right=True, rank=2),
    Column("why", 12, rank=1),
)


class Watched(LiveList):
    """A list that keeps which of its rows it asked to have painted."""

    asked: list[Region]

    def refresh(self, *regions: Region, **settings: bool) -> Watched:
        """Keep the regions and go on as usual."""
        self.asked = [*getattr(self, "asked", []), *regions]
        return super().refresh(*regions, **settings)


class Listing(App[None]):
    """A list alone, and what it told."""

    CSS = "LiveList { height: 1fr; }"

    def __init__(self) -> None:
        super().__init__()
        self.told: list[str] = []

    def compose(self) -> ComposeResult:
        """Hold the list."""
        yield Watched(COLUMNS, id="list")

    def on_live_list_moved(self, event: LiveList.Moved) -> None:
        """Keep where the cursor came to stand."""
        self.told.append(event.key)

    @property
    def list(self) -> Watched:
        """The list."""
        return self.query_one(Watched)


def row(key: str, altitude: str = "40", why: str = "high") -> Row:
    """Return a row of the list."""
    return Row(key, (Span(key), Span(altitude), Span("1.5"), Span(why)))


def heading(text: str) -> Row:
    """Return a heading."""
    return Row(f"# {text}", (Span(text),), heading=True)


def many(count: int = 30) -> list[Row]:
    """Return that many rows: k0, k1 ..."""
    return [row(f"k{number}") for number in range(count)]


def lines(listing: Listing) -> list[str]:
    """Return what the list shows."""
    return [listing.list.render_line(y).text.rstrip() for y in range(listing.list.size.height)]


Story = Callable[[Listing, Pilot[None]], Awaitable[None]]


def play(story: Story, size: tuple[int, int] = (40, 11)) -> None:
    """Run a story on a list."""

    async def run() -> None:
        app = Listing()
        async with app.run_test(size=size) as pilot:
            await pilot.pause()
            await story(app, pilot)

    asyncio.run(run())


def test_the_cursor_keeps_to_its_key_through_a_sort() -> None:
    """The rows turn round; the cursor is on the same target, in sight, and nothing is told."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        app.list.set_rows(many())
        app.list.move_to("k3")
        app.list.set_rows(list(reversed(many())))
        await pilot.pause()
        assert app.list.key == "k3"
        assert any(line.startswith("k3 ") for line in lines(app))
        assert app.told == ["k3"]

    play(story)


def test_the_cursor_passes_over_headings_and_keeps_the_first_in_sight() -> None:
    """Headings can't be chosen, by key, by move or by mouse."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        app.list.set_rows([heading("now"), row("a"), heading("later"), row("b"), row("c")])
        assert app.list.key == "a"
        app.list.move(1)
        assert app.list.key == "b"
        app.list.move_to("# later")
        await pilot.click("#list", offset=(2, 3))
        assert app.list.key == "b"
        await pilot.click("#list", offset=(2, 5))
        assert app.list.key == "c"
        app.list.move(-1, "ends")
        await pilot.pause()
        assert lines(app)[1] == "now"
        assert app.told == ["b", "c", "a"]

    play(story)


@pytest.mark.parametrize(
    ("moves", "expected"),
    [
        ([(1, "ends")], "k29"),
        ([(1, "ends"), (-1, "ends")], "k0"),
        ([(1, "screens")], "k9"),
        ([(1, "screens"), (-1, "screens")], "k0"),
        ([(-1, "rows")], "k0"),
        ([(40, "rows"), (-2, "rows")], "k27"),
    ],
)
def test_the_cursor_moves_and_stays_in_sight(moves: list[tuple[int, str]], expected: str) -> None:
    """By rows, screens and to the ends, never past them."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        app.list.set_rows(many())
        for by, unit in moves:
            app.list.move(by, unit)
        await pilot.pause()
        assert app.list.key == expected
        assert any(line.split()[0] == expected for line in lines(app))
        assert lines(app)[0].startswith("target")

    play(story)


def test_only_a_row_that_changed_is_painted() -> None:
    """One digit of one row: one region one line high; a row out of sight: none."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        rows = many()
        app.list.set_rows(rows)
        await pilot.pause()
        app.list.asked = []
        app.list.set_rows([*rows[:4], row("k4", "41"), *rows[5:]])
        assert app.list.asked == [Region(0, 5, 40, 1)]
        app.list.asked = []
        app.list.set_rows([*rows[:4], row("k4", "41"), *rows[5:20], row("k20", "41"), *rows[21:]])
        assert app.list.asked == []

    play(story)


def test_columns_give_way_by_rank() -> None:
    """Narrower and narrower: air goes first, then the reason, the name never."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        app.list.set_rows(many(2))
        for width, titles in (
            (40, ["target", "alt", "air", "why"]),
            (34, ["target", "alt", "why"]),
            (20, ["target", "alt"]),
            (8, ["target"]),
        ):
            await pilot.resize_terminal(width, 11)
            await pilot.pause()
            assert lines(app)[0].split() == titles

    play(story)


def test_the_cursor_shows_without_colour() -> None:
    """Its row stands out in every look; long and wide texts stay in their columns."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        app.list.set_rows(
            [row("星の名前はとても長い"), row("k1", "1234567", "[/] [b]x[/b] and more")]
        )
        await pilot.pause()
        assert all(app.list.render_line(y).cell_length == 40 for y in range(3))
        shown = lines(app)
        assert "…" in shown[1]
        assert "1234…" in shown[2]
        # Brackets are text, not mark-up.
        assert "[/] [b]x[/b" in shown[2]
        for look in LOOKS.values():
            app.list.set_look(look)
            (under,) = {s.style for s in app.list.render_line(1) if s.text.strip()}
            (beside, *_) = {s.style for s in app.list.render_line(2) if s.text.strip()}
            assert under is not None
            assert beside is not None
            assert under.bold
            assert under.bgcolor != beside.bgcolor

    play(story)


def test_a_row_that_goes_leaves_the_cursor_in_its_place() -> None:
    """The next row below takes the cursor, else the last above; with no rows there is none."""

    async def story(app: Listing, pilot: Pilot[None]) -> None:
        app.list.set_rows([heading("all"), row("a"), row("b"), row("c"), row("d")])
        app.list.move_to("b")
        app.list.set_rows([heading("all"), row("a"), row("d"), row("c")])
        assert app.list.key == "c"
        app.list.set_rows([heading("all"), row("a"), row("d")])
        assert app.list.key == "d"
        app.list.set_rows([heading("all"), row("a")])
        assert app.list.key == "a"
        app.list.set_rows([])
        app.list.move(1)
        assert app.list.key is None
        await pilot.pause()

    play(story)
