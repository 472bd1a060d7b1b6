"""The console's frame: what stands where, which key does what, and when things are painted.

It paints first and loads the engine after: astropy takes longer to import than all the rest, and an
observer who opens a console wants to see it. So nothing here imports the engine but its errors; the
view and the deeds come with the opened night.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterable, Sequence
from functools import partial
from typing import TYPE_CHECKING, Protocol

from textual.app import App, ComposeResult, SystemCommand
from textual.binding import Binding
from textual.containers import Horizontal, Vertical
from textual.driver import Driver
from textual.events import Event, Key, Paste, Resize
from textual.filter import LineFilter
from textual.screen import Screen
from textual.worker import Worker, WorkerState

from engine.errors import WarmroomError
from tui.console.actions import ACTION_OF_KEY, ACTIONS, MOVES, cap, footer_actions
from tui.console.help import HelpScreen
from tui.look import LOOKS, CleanFilter, MonoFilter, RedFilter
from tui.look.terminal import MustLeave
from tui.paint.spans import Line, Span, cut, line
from tui.widgets import Entry, LiveList, Question, Sheet

if TYPE_CHECKING:
    from engine.log import StepWatch
    from engine.watch import Opened, Planned, Watch
    from tui.console.deeds import Deeds
    from tui.console.view import View

TICK_S = 0.5
# With a clock that runs fast, exposures are over in a second or two.
QUICK_TICK_S = 0.2
WIDE_COLUMNS, TALL_ROWS = 120, 34
NOTICES_KEPT = 50
PANELS_WIDE = ("order", "log")
PANELS_NARROW = ("list", "target", "order", "log")

log = logging.getLogger(__name__)


class Autopilot(Protocol):
    """Somebody who observes instead of the observer: the rehearsal's player."""

    def tick(self, watch: Watch) -> Sequence[str]:
        """Do what is to be done now; return what to tell the onlooker."""
        ...


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
    ) -> None:
        super().__init__(driver_class=driver_class)
        self.failure: WarmroomError | None = None
        # What the observer must still be told once the terminal is her shell's again.
        self.parting: str | None = None
        self.live: Watch | None = None
        self.look = look
        self.find_text = ""
        self.panel = "list"
        self.notices: list[Span] = []
        self._open_night = open_night
        self._autopilot = autopilot
        self._tick_s = tick_s
        self._view: View | None = None
        self._deeds: Deeds | None = None
        self._planning = False
        self._notices_steps = notices_steps
        self._steps: StepWatch | None = None

    # What stands where

    def compose(self) -> ComposeResult:
        """Make the frame; every panel is a sheet or the list."""
        yield Sheet(id="head")
        yield Sheet(id="night")
        yield Sheet(id="under-way")
        with Horizontal(id="body"):
            yield LiveList((), id="list")
            with Vertical(id="side"):
                yield Sheet(id="card")
                yield Sheet(id="panel")
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
        self.call_after_refresh(self._load)

    def on_resize(self, event: Resize) -> None:
        """Use a wide screen well, and a small one fully."""
        wide = event.size.width >= WIDE_COLUMNS and event.size.height >= TALL_ROWS
        self.screen_stack[0].set_class(wide, "wide")
        if wide and self.panel not in PANELS_WIDE:
            self.panel = PANELS_WIDE[0]
        elif not wide and self.panel not in PANELS_NARROW:
            self.panel = PANELS_NARROW[0]
        self.call_after_refresh(self.paint)

    @property
    def is_wide(self) -> bool:
        """Whether there is room for the panels beside the list."""
        return self.screen_stack[0].has_class("wide")

    def sheet(self, name: str) -> Sheet:
        """Return a panel by its id."""
        return self.screen_stack[0].query_one(f"#{name}", Sheet)

    # Opening

    def _load(self) -> None:
        self.run_worker(self._opening, name="opening", thread=True, exit_on_error=False)

    def _opening(self) -> Opened:
        # Imported here, on the worker's thread: the view brings the whole engine with it.
        import tui.console.deeds
        import tui.console.view  # noqa: F401 - so that the handler finds it loaded

        return self._open_night()

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        """Adopt what a worker made; what it raised is told, and the night goes on."""
        worker = event.worker
        if worker.name not in ("opening", "planning"):
            return
        if event.state is WorkerState.ERROR:
            self._worker_failed(worker)
        elif event.state is WorkerState.SUCCESS and worker.name == "planning":
            self._planned(worker.result)
        elif event.state is WorkerState.SUCCESS and worker.result is not None:
            self._opened(worker.result)

    def _worker_failed(self, worker: Worker[object]) -> None:
        error = worker.error
        if worker.name == "opening":
            self.failure = (
                error
                if isinstance(error, WarmroomError)
                else WarmroomError(f"the night could not be opened: {error!r}")
            )
            self.exit()
            return
        self._planning = False
        log.error("planning failed", exc_info=error)
        self.tell(f"planning failed ({error!r}); the order shown is the last good one", "bad")

    def _opened(self, opened: Opened) -> None:
        from engine.log import StepWatch
        from tui.console.deeds import Deeds
        from tui.console.view import View

        self.live = opened.watch
        self._view = View(self, opened.watch)
        self._deeds = Deeds(self, opened.watch)
        self._view.prepare()
        if self._notices_steps:
            self._steps = StepWatch(opened.watch.clock)
        for finding in opened.findings[:3]:
            self.tell(f"the log: line {finding.line}: {finding.what}", "warn")
        # A planner's tables are ready now: the first plan can begin at once.
        quick = opened.watch.clock.pace != 1.0
        self.set_interval(min(self._tick_s, QUICK_TICK_S) if quick else self._tick_s, self.beat)
        self.beat()

    # The clockwork

    @property
    def is_settled(self) -> bool:
        """Whether there is a plan and none is being made."""
        return self.live is not None and self.live.plan is not None and not self._planning

    def beat(self) -> None:
        """Do what has come due, and show it: called by a timer."""
        watch = self.live
        if watch is None:
            return
        self._guarded(lambda: self._notice_step(watch))
        self._guarded(watch.tick)
        self._guarded(lambda: self._let_autopilot(watch))
        self._plan_if_wanted(watch, idle=True)
        self.paint()

    def _notice_step(self, watch: Watch) -> None:
        """Log and tell when the computer's clock has jumped."""
        step = self._steps.step() if self._steps is not None else None
        if step is not None:
            watch.submit(step)
            self.tell(f"the computer's clock jumped {step.seconds:+.1f} s: {step.why}", "bad")

    def _let_autopilot(self, watch: Watch) -> None:
        if self._autopilot is not None and watch.plan is not None:
            for said in self._autopilot.tick(watch):
                self.tell(said)

    def _guarded(self, deed: Callable[[], object]) -> None:
        """Do something; what it raises is told, a defect is written down, and the night goes on."""
        try:
            deed()
        except WarmroomError as error:
            self.tell(str(error), "warn")
        except Exception as error:
            log.exception("a defect")
            self.tell(
                f"a defect of warmroom ({error!r}); the log is safe, the night goes on", "bad"
            )

    def _plan_if_wanted(self, watch: Watch, *, idle: bool = False) -> None:
        if self._planning:
            return
        work = watch.planning() or (watch.idling() if idle else None)
        if work is not None:
            self._planning = True
            self.run_worker(work, name="planning", group="plan", thread=True, exit_on_error=False)

    def _planned(self, planned: Planned | None) -> None:
        self._planning = False
        if self.live is None or planned is None:
            return
        self.live.adopt(planned)
        for said in reversed(planned.plan.news):
            self.tell(said, "now")
        self._plan_if_wanted(self.live)
        self.paint()

    def paint(self) -> None:
        """Show everything as it is now; only what changed is sent."""
        if self._view is not None:
            self._guarded(self._view.paint)
        self._paint_notices()

    def tell(self, text: str, role: str = "text") -> None:
        """Tell the observer something in the notice lines, the newest last."""
        self.notices = [*self.notices, Span(text, role)][-NOTICES_KEPT:]
        self._paint_notices()

    def _paint_notices(self) -> None:
        if not self.screen_stack:
            return
        sheet = self.sheet("notices")
        rows = max(sheet.size.height, 1)
        shown: list[Line] = [(Span(" "), each) for each in self.notices[-rows:]]
        sheet.show([cut(each, sheet.size.width) for each in shown])

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
            self._guarded(lambda: self._entry.take_key(event.key, event.character))
            self.paint()
        elif event.key in ACTION_OF_KEY:
            self.action_do(ACTION_OF_KEY[event.key])
        elif event.key in MOVES:
            self._list.move(*MOVES[event.key])
        elif event.key == "escape":
            self._put_aside()
        else:
            return False
        return True

    @property
    def _entry(self) -> Entry:
        return self.screen_stack[0].query_one("#entry", Entry)

    @property
    def _list(self) -> LiveList:
        return self.screen_stack[0].query_one("#list", LiveList)

    def action_do(self, name: str) -> None:
        """Do an action of the table; what can't be done now is told in one line."""
        own = getattr(self, f"_do_{name}", None)
        deeds = self._deeds
        if own is not None:
            self._guarded(own)
        elif deeds is None:
            self.tell("the night is still being opened", "dim")
        else:
            self._guarded(lambda: deeds.do(name))
        self.after_deed()

    def after_deed(self) -> None:
        """Plan anew if the deed asks for it, and show what it did."""
        if self.live is not None:
            self._plan_if_wanted(self.live)
        self.paint()

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
        panels = PANELS_WIDE if self.is_wide else PANELS_NARROW
        self.panel = panels[(panels.index(self.panel) + 1) % len(panels)]

    def _do_next_look(self) -> None:
        names = list(LOOKS)
        self.set_look(names[(names.index(self.look) + 1) % len(names)])

    def _do_help(self) -> None:
        self.push_screen(HelpScreen(LOOKS[self.look]))

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
        if self._view is not None:
            self._view.paint_foot()
            return
        keys = [(cap(a.keys[0]), a.label) for a in footer_actions()]
        self.sheet("foot").show([foot_line(keys)])

    def get_system_commands(self, screen: Screen[object]) -> Iterable[SystemCommand]:
        """Offer every action of the table in the command palette."""
        for action in ACTIONS:
            yield SystemCommand(action.label, action.sentence, partial(self.action_do, action.name))


def foot_line(keys: Iterable[tuple[str, str]]) -> Line:
    """Return the foot: each key and its word."""
    spans: list[Span] = []
    for key, word in keys:
        spans += [Span(f" {key}", "accent"), Span(f" {word} ", "dim")]
    return tuple(spans)
