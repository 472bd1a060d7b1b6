"""The console's frame: what stands where, which key does what, and when things are painted.

It paints first and loads the engine after: astropy takes longer to import than all the rest, and an
observer who opens a console wants to see it. So nothing here imports the engine but its errors; the
painting, the views and the deeds come with the opened night.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from functools import partial
from typing import TYPE_CHECKING

from textual.app import App, ComposeResult, SystemCommand
from textual.binding import Binding
from textual.containers import Horizontal, Vertical
from textual.driver import Driver
from textual.events import Event, Key, Paste, Resize
from textual.filter import LineFilter
from textual.screen import Screen
from textual.worker import Worker

from engine.errors import NotNow, WarmroomError
from tui.console.actions import MOVES
from tui.console.clockwork import TICK_S, Autopilot, Clockwork
from tui.console.foot import foot_keys, foot_line
from tui.console.help import HelpScreen
from tui.console.keys import Keys
from tui.console.views import NIGHT, VIEW_OF_ACTION
from tui.look import LOOKS, CleanFilter, MonoFilter, RedFilter
from tui.look.terminal import MustLeave
from tui.paint.spans import Line, Span, cut, line, whole_phrases
from tui.widgets import Entry, LiveList, Question, Sheet

if TYPE_CHECKING:
    from engine.watch import Opened, Watch
    from tui.console.deeds import Deeds
    from tui.console.painting import Painting
    from tui.console.views.base import View

WIDE_COLUMNS, TALL_ROWS = 120, 34
NOTICES_KEPT = 50
# Sheets, the list and the entry line of the frame.
PIECES = 11
PANELS_WIDE = ("order", "log")
PANELS_NARROW = ("list", "target", "order", "log")


class Console(App[None]):
    """The console of one night."""

    CSS_PATH = "console.tcss"
    # Keys are taken one by one in `on_event`, from the table of actions; only what Textual itself
    # must see is bound here.
    BINDINGS = [Binding("ctrl+p", "command_palette", show=False, priority=True)]  # noqa: RUF012
    ENABLE_COMMAND_PALETTE = True
    TITLE = "warmroom"

    def __init__(
        self,
        open_night: Callable[[], Opened],
        *,
        look: str = "night",
        autopilot: Autopilot | None = None,
        tick_s: float = TICK_S,
        driver_class: type[Driver] | None = None,
        notices_steps: bool = False,
        keys: Keys | None = None,
    ) -> None:
        super().__init__(driver_class=driver_class)
        self.failure: WarmroomError | None = None
        # What the observer must still be told once the terminal is her shell's again.
        self.parting: str | None = None
        self.look = look
        self.keys = keys or Keys()
        self.find_text = ""
        self.panel = "list"
        self.notices: list[Span] = []
        self.view = NIGHT
        self._paint_is_due = False
        self._painting: Painting | None = None
        self._deeds: Deeds | None = None
        self._clockwork = Clockwork(
            self,
            open_night,
            autopilot=autopilot,
            tick_s=tick_s,
            notices_steps=notices_steps,
        )

    # What stands where

    def compose(self) -> ComposeResult:
        """Make the frame; every panel is a sheet or the list."""
        yield Sheet(id="head")
        yield Sheet(id="alarm")
        yield Sheet(id="night")
        yield Sheet(id="under-way")
        with Horizontal(id="body"):
            yield LiveList((), id="list")
            with Vertical(id="side"):
                yield Sheet(id="card")
                yield Sheet(id="panel")
        yield Sheet(id="view")
        yield Sheet(id="notices")
        yield Entry(id="entry")
        yield Sheet(id="foot")

    def on_mount(self) -> None:
        """Paint the frame, then load the engine and open the night off the loop."""
        self.animation_level = "none"
        for look in LOOKS.values():
            self.register_theme(look.theme())
        self.set_look(self.look)
        self.sheet("under-way").show([line(Span(" opening the night ...", "dim"))])
        self.call_after_refresh(self._clockwork.open)

    def on_resize(self, event: Resize) -> None:
        """Use a wide screen well, and a small one fully."""
        wide = event.size.width >= WIDE_COLUMNS and event.size.height >= TALL_ROWS
        self.screen_stack[0].set_class(wide, "wide")
        if wide and self.panel not in PANELS_WIDE:
            self.panel = PANELS_WIDE[0]
        elif not wide and self.panel not in PANELS_NARROW:
            self.panel = PANELS_NARROW[0]

    def on_sheet_resized(self, event: Sheet.Resized) -> None:
        """Paint for the new sizes, once for all sheets that got one."""
        if not self._paint_is_due:
            self._paint_is_due = True
            self.call_after_refresh(self._paint_due)

    def _paint_due(self) -> None:
        self._paint_is_due = False
        self.paint()

    @property
    def _is_whole(self) -> bool:
        """Whether the whole frame stands: when it is left it goes piece by piece."""
        pieces = self.screen_stack[0].query("Sheet, LiveList, Entry") if self.screen_stack else ()
        return len(pieces) == PIECES

    @property
    def is_wide(self) -> bool:
        """Whether there is room for the panels beside the list."""
        return self.screen_stack[0].has_class("wide")

    def sheet(self, name: str) -> Sheet:
        """Return a panel by its id."""
        return self.screen_stack[0].query_one(f"#{name}", Sheet)

    # The night

    @property
    def live(self) -> Watch | None:
        """The watch over the night; None until it is open."""
        return self._clockwork.watch

    @property
    def is_settled(self) -> bool:
        """Whether there is a plan and none is being made."""
        return self._clockwork.is_settled

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        """Let the clockwork adopt what a worker made."""
        self._clockwork.take_from(event.worker, event.state)

    def adopt(self, opened: Opened) -> None:
        """Show the night that was opened."""
        from tui.console.deeds import Deeds
        from tui.console.painting import Painting

        self._painting = Painting(self, opened.watch)
        self._deeds = Deeds(self, opened.watch)
        for fault in self.keys.faults:
            self.tell(fault, "warn")
        for finding in opened.findings[:3]:
            self.tell(f"the log: line {finding.line}: {finding.what}", "warn")

    def give_up(self, failure: WarmroomError) -> None:
        """Leave because the night could not be opened."""
        self.failure = failure
        self.exit()

    def beat(self) -> None:
        """Do what has come due, and show it: called by a timer."""
        self._clockwork.beat()
        self.paint()

    def paint(self) -> None:
        """Show everything as it is now; only what changed is sent."""
        if not self._is_whole:
            return
        if self._painting is not None:
            self._clockwork.guarded(self._painting.paint)
        self._paint_notices()

    def tell(self, text: str, role: str = "text") -> None:
        """Tell the observer something in the notice lines, the newest last."""
        self.notices = [*self.notices, Span(text, role)][-NOTICES_KEPT:]
        self._paint_notices()

    def _paint_notices(self) -> None:
        if not self._is_whole:
            return
        sheet = self.sheet("notices")
        rows = max(sheet.size.height, 1)
        width = sheet.size.width
        shown: list[Line] = [
            (Span(" "), Span(whole_phrases(text, width - 1), role))
            for text, role in self.notices[-rows:]
        ]
        sheet.show([cut(each, width) for each in shown])

    # What the observer does

    async def on_event(self, event: Event) -> None:
        """Take keys and pasted text in the order in which they came.

        Textual hands a key from queue to queue until somebody wants it, so that in a burst, as a
        slow link makes them, keys overtake each other and an answer becomes a command. Here each
        is done before the next is looked at.
        """
        if isinstance(event, Key) and self._take_key(event):
            return
        if isinstance(event, Paste) and self._entry.is_open:
            self._entry.take_text(event.text)
            return
        await super().on_event(event)

    def _take_key(self, event: Key) -> bool:
        """Do what a key does; return whether it was for the console itself."""
        if len(self.screen_stack) != 1:
            return False
        if self._entry.is_open:
            self._clockwork.guarded(lambda: self._entry.take_key(event.key, event.character))
            self.paint()
        elif (action := self.keys.action_of(event.key, event.character)) is not None:
            self.action_do(action)
        elif event.key in MOVES:
            self._clockwork.guarded(lambda: self._move(*MOVES[event.key]))
        elif self._is_taken_by_view(event):
            self.paint()
        elif event.key == "escape":
            self._put_aside()
        else:
            return False
        return True

    def _is_taken_by_view(self, event: Key) -> bool:
        """Offer a key to the view that is shown; what it can't do now is told in one line."""
        view, taken = self._shown_view, True

        def offer() -> None:
            nonlocal taken
            taken = view is not None and view.take_key(event.key, event.character)

        self._clockwork.guarded(offer)
        return taken

    def _move(self, by: int, unit: str) -> None:
        """Move the cursor of the view that is shown, else that of the list."""
        view = self._shown_view
        if view is None or not view.move(by, unit):
            self._list.move(by, unit)
        self.paint()

    @property
    def _entry(self) -> Entry:
        return self.screen_stack[0].query_one("#entry", Entry)

    @property
    def _list(self) -> LiveList:
        return self.screen_stack[0].query_one("#list", LiveList)

    def action_do(self, name: str) -> None:
        """Do an action of the table; what can't be done now is told in one line."""
        self._clockwork.guarded(lambda: self._do(name))
        self.after_deed()

    def _do(self, name: str) -> None:
        view, own = self._shown_view, getattr(self, f"_do_{name}", None)
        if name in VIEW_OF_ACTION:
            self.show_view(VIEW_OF_ACTION[name])
        elif view is not None and view.take_action(name):
            return
        elif own is not None:
            own()
        elif self._deeds is None:
            self.tell("the night is still being opened", "dim")
        else:
            self._deeds.do(name)

    def after_deed(self) -> None:
        """Plan anew if the deed asks for it, and show what it did."""
        self._clockwork.plan_if_wanted()
        self.paint()

    @property
    def chosen(self) -> str | None:
        """The name of the target under the cursor, the same in every view."""
        return self._list.key

    def choose(self, name: str) -> None:
        """Put the cursor on a target."""
        self._list.move_to(name)

    def show_view(self, name: str) -> None:
        """Show a view of the table in the place under the state of the night."""
        self.view = name
        self.screen_stack[0].set_class(name != NIGHT, "aside")

    @property
    def _shown_view(self) -> View | None:
        return self._painting.view if self._painting is not None else None

    def ask(self, question: Question) -> None:
        """Ask for something in the entry line."""
        self._entry.ask(question)

    def _put_aside(self) -> None:
        """Clear the search, else the notices."""
        if self.find_text:
            self.find_text = ""
        else:
            self.notices = []
        self.paint()

    def on_live_list_moved(self, event: LiveList.Moved) -> None:
        """Show the target under the cursor."""
        self.paint()

    def _do_next_panel(self) -> None:
        if self.view != NIGHT:
            raise NotNow(
                f"the panels are the night's: {self.keys.cap_of(f'view_{NIGHT}')} shows it"
            )
        panels = PANELS_WIDE if self.is_wide else PANELS_NARROW
        self.panel = panels[(panels.index(self.panel) + 1) % len(panels)]

    def _do_next_look(self) -> None:
        names = list(LOOKS)
        self.set_look(names[(names.index(self.look) + 1) % len(names)])

    def _do_acknowledge(self) -> None:
        seen = self._painting.alarms.acknowledge() if self._painting is not None else None
        if seen is None:
            self.tell("no alarm waits to be seen", "dim")
        else:
            self.tell(f"seen: {seen.cause.label.lower()}, {seen.cause.sentence}", "dim")

    def _do_help(self) -> None:
        self.push_screen(HelpScreen(LOOKS[self.look], self.keys))

    def _do_leave(self) -> None:
        watch = self.live
        if watch is None or (watch.state.exposing is None and not watch.unwritten):
            self._leave()
            return
        why = "an exposure is under way" if watch.state.exposing else "the log is not yet on disk"
        self.ask(
            Question(
                f"{why}; leave all the same?", str, self._answer_leave, (("y", "yes"), ("n", "no"))
            )
        )

    def _answer_leave(self, answer: str) -> None:
        if answer == "y":
            self._leave()

    def on_must_leave(self, event: MustLeave) -> None:
        """End at once, with the log closed: the terminal is gone, or the system says so."""
        self._leave(event.why, event.status)

    def _leave(self, why: str = "left by the observer", status: int = 0) -> None:
        if self.live is not None:
            self.parting = self.live.close(why)
        self.exit(return_code=status)

    # Looks

    def set_look(self, name: str) -> None:
        """Draw everything in another look."""
        self.look = name
        self.theme = f"warmroom-{name}"
        for sheet in self.screen_stack[0].query(Sheet):
            sheet.set_look(LOOKS[name])
        self.refresh(layout=True)
        self._paint_foot()

    def get_line_filters(self) -> Sequence[LineFilter]:
        """Return the filters over every cell: the look's own, and the one that cleans text last."""
        filters = list(super().get_line_filters())
        if self.look == "red":
            filters.append(RedFilter(sixteen_colours=self.console.color_system == "standard"))
        elif self.look == "mono":
            filters.append(MonoFilter())
        return [*filters, CleanFilter()]

    def _paint_foot(self) -> None:
        if self._painting is not None:
            self._painting.paint_foot()
            return
        self.sheet("foot").show([foot_line(foot_keys(self.keys), self.size.width)])

    def get_system_commands(self, screen: Screen[object]) -> Iterable[SystemCommand]:
        """Offer every action of the table in the command palette."""
        for action in self.keys.actions:
            yield SystemCommand(action.label, action.sentence, partial(self.action_do, action.name))
