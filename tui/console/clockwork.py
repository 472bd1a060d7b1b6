"""The console's clockwork: opening the night off the loop, what comes due, and planning.

Heavy work is done by workers on threads of their own; what they made is adopted here, on the loop.
Nothing that is imported with this module brings the engine with it, so that the console can paint
first.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Protocol

from textual.worker import Worker, WorkerState

from engine.errors import WarmroomError

if TYPE_CHECKING:
    from engine.log import StepWatch
    from engine.watch import Opened, Planned, Watch
    from tui.console.app import Console

TICK_S = 0.5
# With a clock that runs fast, exposures are over in a second or two.
QUICK_TICK_S = 0.2

log = logging.getLogger(__name__)


class Autopilot(Protocol):
    """Somebody who observes instead of the observer: the rehearsal's player."""

    def tick(self, watch: Watch) -> Sequence[str]:
        """Do what is to be done now; return what to tell the onlooker."""
        ...


class Clockwork:
    """Opens the night and keeps it going; tells the console what there is to show."""

    def __init__(
        self,
        console: Console,
        open_night: Callable[[], Opened],
        *,
        autopilot: Autopilot | None = None,
        tick_s: float = TICK_S,
        notices_steps: bool = False,
    ) -> None:
        self.watch: Watch | None = None
        self._console = console
        self._open_night = open_night
        self._autopilot = autopilot
        self._tick_s = tick_s
        self._notices_steps = notices_steps
        self._planning = False
        self._steps: StepWatch | None = None

    @property
    def is_settled(self) -> bool:
        """Whether there is a plan and none is being made."""
        return self.watch is not None and self.watch.plan is not None and not self._planning

    # Opening

    def open(self) -> None:
        """Load the engine and open the night, on a thread."""
        self._console.run_worker(self._opening, name="opening", thread=True, exit_on_error=False)

    def _opening(self) -> Opened:
        # Imported here, on the worker's thread: the painting brings the whole engine with it.
        import tui.console.deeds
        import tui.console.painting  # noqa: F401 - so that the handler finds it loaded

        return self._open_night()

    def take_from(self, worker: Worker[object], state: WorkerState) -> None:
        """Adopt what a worker made; what it raised is told, and the night goes on."""
        if worker.name not in ("opening", "planning"):
            return
        if state is WorkerState.ERROR:
            self._failed(worker)
        elif state is WorkerState.SUCCESS and worker.name == "planning":
            self._planned(worker.result)  # type: ignore[arg-type]
        elif state is WorkerState.SUCCESS and worker.result is not None:
            self._opened(worker.result)  # type: ignore[arg-type]

    def _failed(self, worker: Worker[object]) -> None:
        error = worker.error
        if worker.name == "opening":
            self._console.give_up(
                error
                if isinstance(error, WarmroomError)
                else WarmroomError(f"the night could not be opened: {error!r}")
            )
            return
        self._planning = False
        log.error("planning failed", exc_info=error)
        self._console.tell(
            f"planning failed ({error!r}); the order shown is the last good one", "bad"
        )

    def _opened(self, opened: Opened) -> None:
        self.watch = opened.watch
        if self._notices_steps:
            from engine.log import StepWatch

            self._steps = StepWatch(opened.watch.clock)
        self._console.adopt(opened)
        # A planner's tables are ready now: the first plan can begin at once.
        quick = opened.watch.clock.pace != 1.0
        tick_s = min(self._tick_s, QUICK_TICK_S) if quick else self._tick_s
        self._console.set_interval(tick_s, self._console.beat)
        self._console.beat()

    # What comes due

    def beat(self) -> None:
        """Do what has come due: the log's clock, exposures, a player's moves, a plan."""
        watch = self.watch
        if watch is None:
            return
        self.guarded(lambda: self._notice_step(watch))
        self.guarded(watch.tick)
        self.guarded(lambda: self._let_autopilot(watch))
        self.plan_if_wanted(idle=True)

    def _notice_step(self, watch: Watch) -> None:
        """Log and tell when the computer's clock has jumped."""
        step = self._steps.step() if self._steps is not None else None
        if step is not None:
            watch.submit(step)
            self._console.tell(
                f"the computer's clock jumped {step.seconds:+.1f} s: {step.why}", "bad"
            )

    def _let_autopilot(self, watch: Watch) -> None:
        if self._autopilot is not None and watch.plan is not None:
            for said in self._autopilot.tick(watch):
                self._console.tell(said)

    def guarded(self, deed: Callable[[], object]) -> None:
        """Do something; what it raises is told, a defect is written down, and the night goes on."""
        try:
            deed()
        except WarmroomError as error:
            self._console.tell(str(error), "warn")
        except Exception as error:
            log.exception("a defect")
            self._console.tell(
                f"a defect of warmroom ({error!r}); the log is safe, the night goes on", "bad"
            )

    # Planning

    def plan_if_wanted(self, *, idle: bool = False) -> None:
        """Begin the planning that is wanted, if none is under way."""
        watch = self.watch
        if self._planning or watch is None:
            return
        work = watch.planning() or (watch.idling() if idle else None)
        if work is not None:
            self._planning = True
            self._console.run_worker(
                work, name="planning", group="plan", thread=True, exit_on_error=False
            )

    def _planned(self, planned: Planned | None) -> None:
        self._planning = False
        if self.watch is None:
            return
        if planned is None:
            # An idle look found nothing; what was wanted meanwhile has waited for it.
            self.plan_if_wanted()
            return
        self.watch.adopt(planned)
        for said in reversed(planned.plan.news):
            self._console.tell(said, "now")
        self.plan_if_wanted()
        self._console.paint()
