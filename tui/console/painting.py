"""What every panel and view shows, from the watch: the only place where they meet widgets."""

from __future__ import annotations

from typing import TYPE_CHECKING

from engine.watch import Watch
from engine.watch.alarms import Alarms, causes_now
from tui.console.foot import foot_keys, foot_line, views_line
from tui.console.panels.alarms import TALL, paint_alarm
from tui.console.panels.head import paint_head
from tui.console.panels.night import paint_night
from tui.console.panels.record import paint_log, paint_order
from tui.console.panels.target import paint_target
from tui.console.panels.targets import COLUMNS, target_rows
from tui.console.panels.under_way import go_on_label, paint_under_way
from tui.console.views import NIGHT
from tui.console.views.base import View
from tui.console.views.classes import CLASSES
from tui.paint.spans import Line
from tui.widgets import LiveList

if TYPE_CHECKING:
    from tui.console.app import Console


class Painting:
    """Paints the console from its watch. Keeps nothing of the night."""

    def __init__(self, console: Console, watch: Watch) -> None:
        self._console = console
        self._watch = watch
        self.alarms = Alarms()
        self._followed_n = 0
        self._trouble: str | None = None
        self._views: dict[str, View] = {}
        self._list.set_columns(COLUMNS)

    @property
    def view(self) -> View | None:
        """The view that is shown; None when it is the night itself."""
        name = self._console.view
        if name == NIGHT:
            return None
        if name not in self._views:
            self._views[name] = CLASSES[name](self._console, self._watch)
        return self._views[name]

    @property
    def _list(self) -> LiveList:
        return self._console.screen_stack[0].query_one("#list", LiveList)

    def paint(self) -> None:
        """Show everything as it is now."""
        console, watch = self._console, self._watch
        head, night = console.sheet("head"), console.sheet("night")
        head.show(paint_head(watch, head.size.width))
        night.show(paint_night(watch, night.size.width, night.size.height))
        under_way = console.sheet("under-way")
        under_way.show(paint_under_way(watch, under_way.size.width, under_way.size.height))
        self._list.set_rows(target_rows(watch, console.find_text))
        self._follow_the_telescope()
        if self.view is None:
            self._paint_panels()
        else:
            self._paint_view(self.view)
        self.paint_alarms()
        self._tell_trouble()
        self.paint_foot()

    def _follow_the_telescope(self) -> None:
        """Put the cursor on the target the telescope was just sent to, or that just came in."""
        state = self._watch.state
        if state.pointing is not None and state.pointing.n > self._followed_n:
            self._followed_n = state.pointing.n
            self._list.move_to(state.pointing.target)
        if state.added and state.added[-1].n > self._followed_n:
            # It has its row once the order was made anew.
            name = state.added[-1].name
            if any(target.name == name for target in self._watch.planner.night.targets):
                self._followed_n = state.added[-1].n
                self._list.move_to(name)

    def paint_foot(self) -> None:
        """Show the keys, the common one with what it does now, and those of the view."""
        view, labels = self.view, {"go_on": go_on_label(self._watch)}
        if view is None:
            keys = foot_keys(self._console.keys, labels)
        else:
            # The panels are the night's own.
            keys = foot_keys(self._console.keys, labels, view.hints, without=("next_panel",))
        foot = self._console.sheet("foot")
        foot.show([foot_line(keys, foot.size.width)])

    def _paint_view(self, view: View) -> None:
        """Show a view below a line that names it and all others."""
        sheet = self._console.sheet("view")
        width, height = sheet.size
        # It has no size until it has been laid out; then it is painted again.
        if height > 1:
            sheet.show(
                [
                    views_line(self._console.view, width, self._console.keys),
                    *view.paint(width, height - 1),
                ]
            )

    def _paint_panels(self) -> None:
        self._arrange()
        if self._console.is_wide:
            self._paint_panel("card", "target")
        if self._console.panel != "list":
            self._paint_panel("panel", self._console.panel)

    def _arrange(self) -> None:
        """Show list and panels side by side where there is room, else one in place of the other."""
        console = self._console
        side = console.screen_stack[0].query_one("#side")
        if console.is_wide:
            self._list.display = side.display = True
            console.sheet("card").display = True
            return
        self._list.display = console.panel == "list"
        side.display = console.panel != "list"
        console.sheet("card").display = False

    def _paint_panel(self, sheet_name: str, panel: str) -> None:
        sheet = self._console.sheet(sheet_name)
        width, height = sheet.size
        sheet.show(self._panel(panel, width, height))

    def _panel(self, panel: str, width: int, height: int) -> list[Line]:
        match panel:
            case "target":
                return paint_target(self._watch, self._list.key, width, height)
            case "order":
                return paint_order(self._watch, width, height)
            case _:
                return paint_log(self._watch, width, height)

    def paint_alarms(self) -> None:
        """Show the alarm that waits longest, and ring once for each new one."""
        console, watch = self._console, self._watch
        if self.alarms.update(causes_now(watch), watch.clock.now_mjd()):
            console.bell()
        sheet = console.sheet("alarm")
        waiting = self.alarms.waiting
        sheet.display = bool(waiting)
        rows = TALL if console.is_wide else 1
        key = console.keys.cap_of("acknowledge")
        sheet.show(paint_alarm(waiting, key, sheet.size.width, rows))

    def _tell_trouble(self) -> None:
        """Tell that the log is on disk again when it was not."""
        trouble = self._watch.trouble
        if self._trouble and trouble is None:
            self._console.tell("the log is on disk again", "good")
        self._trouble = trouble
