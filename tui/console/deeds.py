"""What each action does: questions to the observer on one side, acts on the watch on the other."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING

from engine.errors import NotNow
from engine.log import LOST_CAUSES, Conditions
from engine.logbook import typed_target
from engine.watch import Stage, Watch, acts
from tui.console.asking import ask_and_do, text_of
from tui.console.panels.local import ahead
from tui.console.read import moment_in
from tui.reading import number_between
from tui.widgets import LiveList

if TYPE_CHECKING:
    from tui.console.app import Console

# Letter, word, the log's key, unit, least and greatest value that can be true.
QUANTITIES = (
    ("c", "cloud", "cloud_percent", "%", 0.0, 100.0),
    ("w", "wind", "wind_m_per_s", "m/s", 0.0, 100.0),
    ("h", "humidity", "humidity_percent", "%", 0.0, 100.0),
    ("t", "temperature", "temperature_c", "°C", -60.0, 50.0),
    ("d", "dew point", "dew_point_c", "°C", -80.0, 40.0),
    ("p", "pressure", "pressure_hpa", "hPa", 400.0, 1100.0),
)


class Deeds:
    """Does the actions of the table that concern the night."""

    def __init__(self, console: Console, watch: Watch) -> None:
        self._console = console
        self._watch = watch

    def do(self, name: str) -> None:
        """Do an action by its name; WarmroomError when it can't be done now."""
        deed: Callable[[], None] = getattr(self, name)
        deed()

    # The common round

    def go_on(self) -> None:
        """Do the next thing of the round."""
        watch = self._watch
        match watch.stage:
            case Stage.IDLE:
                self._accept()
            case Stage.MOVING:
                acts.arrive(watch)
            case Stage.READY:
                self._start_or_accept()
            case Stage.LOST:
                acts.end_lost(watch)
            case Stage.CUT_OFF:
                raise NotNow("an exposure was cut off: K keeps it, L logs it as lost")
            case _:
                raise NotNow("the run goes on by itself; s stops it")

    def _accept(self) -> None:
        if self._watch.plan is None:
            raise NotNow("the order is still being worked out")
        visits = ahead(self._watch)
        if not visits:
            raise NotNow("nothing more can be observed tonight")
        acts.point_at(self._watch, visits[0].target)

    def _start_or_accept(self) -> None:
        lines = acts.lines_now(self._watch)
        if lines:
            acts.start_run(self._watch, lines)
        else:
            self._accept()

    def choose(self) -> None:
        """Point at the target under the cursor."""
        key = self._under_cursor()
        now = next((each for each in self._watch.targets_now() if each.target.name == key), None)
        acts.point_at(self._watch, key)
        if now is not None and now.reasons:
            self._console.tell(f"{key}: {now.reasons[0].sentence}", "warn")

    # The observer's rules

    def _under_cursor(self) -> str:
        key = self._console.query_one("#list", LiveList).key
        if key is None:
            raise NotNow("no target is under the cursor")
        return key

    def drop(self) -> None:
        """Drop the target under the cursor for tonight, or take it back."""
        acts.drop(self._watch, self._under_cursor())

    def put_off(self) -> None:
        """Put the target under the cursor off for some minutes."""
        name = self._under_cursor()
        self._ask(
            f"put {name} off for, minutes",
            number_between(1.0, 720.0, "minutes"),
            lambda minutes: acts.put_off(self._watch, name, minutes),
        )

    def take_next(self) -> None:
        """Let the target under the cursor be next, or no longer."""
        acts.take_next(self._watch, self._under_cursor())

    def take_at(self) -> None:
        """Let the target under the cursor begin at a time."""
        name = self._under_cursor()
        self._ask(
            f"{name} is to begin at, local time",
            moment_in(self._watch.planner.night.almanac, self._watch.planner.logbook),
            lambda at_mjd: acts.take_at(self._watch, name, at_mjd),
        )

    def hold(self) -> None:
        """Stay on the present target, or no longer."""
        acts.hold(self._watch)

    def insert(self) -> None:
        """Take a new target in by its coordinates."""
        wheel = [each.name for each in self._watch.planner.logbook.observatory.filters]
        self._ask(
            f"ra dec exposures name (05:34:31.9 +22:00:52 {wheel[0]}:60x5)",
            lambda text: typed_target(text, wheel),
            lambda target: acts.insert(self._watch, target),
        )

    def filter_aside(self) -> None:
        """Put a filter aside for tonight, or use it again."""
        wheel = self._watch.planner.logbook.observatory.filters
        choices = tuple((str(place), each.name) for place, each in enumerate(wheel[:9], start=1))
        self._ask(
            "which filter",
            str,
            lambda number: acts.put_filter_aside(self._watch, wheel[int(number) - 1].name),
            choices,
        )

    # Exposures

    def stop(self) -> None:
        """Stop the run."""
        acts.stop(self._watch)

    def reject(self) -> None:
        """Reject the last exposure that counts, with a reason."""
        self._ask("why is it rejected", text_of(200), lambda why: acts.reject(self._watch, why))

    def repeat(self) -> None:
        """Repeat the last exposure."""
        acts.repeat(self._watch)

    def one_filter(self) -> None:
        """Start a run in one filter of the plan."""
        watch = self._watch
        pointing = watch.state.pointing
        plan = acts.this_visit(watch, pointing.target) if pointing else ()
        left = [line for line in plan if line.remaining]
        if watch.stage is not Stage.READY or not left:
            raise NotNow("the telescope is not on a target with something left of its plan")
        choices = tuple((str(place), line.filter) for place, line in enumerate(left, start=1))
        self._ask(
            "which filter",
            str,
            lambda number: acts.start_run(watch, (left[int(number) - 1],)),
            choices,
        )

    def keep_cut_off(self) -> None:
        """Keep what was cut off."""
        acts.keep_cut_off(self._watch)

    def lose_cut_off(self) -> None:
        """Lose what was cut off."""
        acts.lose_cut_off(self._watch)

    # Conditions

    def measure(self) -> None:
        """Type a measured FWHM."""
        last = acts.last_exposure(self._watch)
        if last is None or last.airmass_mid is None:
            raise NotNow("no exposure yet to measure; z enters the zenith seeing")
        label = f"FWHM on {last.target} in {last.filter} at airmass {last.airmass_mid:.2f}, arcsec"
        read = number_between(0.1, 30.0, "arcsec")
        self._ask(label, read, lambda value: acts.measured_fwhm(self._watch, value))

    def seeing(self) -> None:
        """Type the zenith seeing."""
        read = number_between(0.1, 20.0, "arcsec")
        self._ask(
            "seeing at the zenith, 500 nm, arcsec",
            read,
            lambda value: acts.zenith_seeing(self._watch, value),
        )

    def conditions(self) -> None:
        """Choose a quantity, then type it."""
        choices = tuple((letter, word) for letter, word, *_ in QUANTITIES)
        self._ask("which", str, self._ask_quantity, choices)

    def _ask_quantity(self, letter: str) -> None:
        _, word, key, unit, least, greatest = next(q for q in QUANTITIES if q[0] == letter)
        self._ask(
            f"{word}, {unit}",
            number_between(least, greatest, unit),
            lambda value: acts.conditions(self._watch, replace(Conditions(), **{key: value})),
        )

    # The night

    def lost(self) -> None:
        """Begin lost time with a cause, or end it."""
        if self._watch.state.lost_since is not None:
            acts.end_lost(self._watch)
            return
        letters = {cause.label[0]: cause.value for cause in LOST_CAUSES}
        self._ask(
            "time is lost to",
            str,
            lambda letter: acts.begin_lost(self._watch, letters[letter]),
            tuple((cause.label[0], cause.label) for cause in LOST_CAUSES),
        )

    def note(self) -> None:
        """Type a note."""
        self._ask("note", text_of(2000, least=1), lambda text: acts.note(self._watch, text))

    def undo(self) -> None:
        """Withdraw the last entry."""
        _, what = acts.undo(self._watch)
        self._console.tell(f"withdrawn: {what}", "now")

    def find(self) -> None:
        """Type what names to show."""

        def show(text: str) -> None:
            self._console.find_text = text

        self._ask("show targets with", text_of(80), show)

    def _ask(
        self,
        label: str,
        read: Callable[[str], object],
        then: Callable[..., object],
        choices: tuple[tuple[str, str], ...] = (),
    ) -> None:
        ask_and_do(self._console, label, read, then, choices)
