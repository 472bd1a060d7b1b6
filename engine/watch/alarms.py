"""Alarms: what must not be missed at two in the morning, until the observer has said she saw it.

An alarm stands while its cause does. One that nobody acknowledged is still shown when its cause has
gone; one that was acknowledged and comes again soon is not raised anew, so that a value that
wanders about a threshold does not ring all night. They are advice: for the safety of people and
instrument the observatory's own rules and its duty staff decide.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from engine.log import RunStop
from engine.night import reasons_in
from engine.times import MINUTES_PER_DAY
from engine.watch.advice import cautions
from engine.watch.stage import Stage, next_in_run
from engine.watch.watch import Watch

# Minutes ahead at which a limit, or the end of the dark, is an alarm; minutes after which a seeing
# is old; minutes for which an acknowledged alarm stays quiet: common practice, no source.
LEAVING_MIN, DAWN_MIN, STALE_MIN, QUIET_MIN = 12.0, 15.0, 60.0, 10.0


@dataclass(frozen=True, slots=True)
class Cause:
    """Something that calls for an alarm now.

    ``code`` says what kind and ``subject`` of what; both together are the same as long as it is the
    same alarm. ``label`` is legible from afar, ``sentence`` says what and ``advice`` what to do.
    Of one that ``answers_itself`` the end shows that the observer has acted.
    """

    code: str
    subject: str
    label: str
    sentence: str
    advice: str = ""
    answers_itself: bool = False


@dataclass(frozen=True, slots=True)
class Alarm:
    """An alarm on the screen: its cause as last seen, since when (UTC MJD), whether it stands."""

    cause: Cause
    since_mjd: float
    stands: bool


@dataclass(slots=True)
class _Known:
    cause: Cause
    since_mjd: float
    seen_mjd: float
    stands: bool = True
    acknowledged: bool = False


class Alarms:
    """The alarms of a night: raised once, kept until acknowledged and over."""

    def __init__(self) -> None:
        self._known: dict[tuple[str, str], _Known] = {}

    @property
    def waiting(self) -> tuple[Alarm, ...]:
        """The alarms nobody has acknowledged yet, the oldest first."""
        return tuple(
            Alarm(each.cause, each.since_mjd, each.stands)
            for each in self._known.values()
            if not each.acknowledged
        )

    def update(self, causes: Sequence[Cause], now_mjd: float) -> bool:
        """Take in what stands at a moment (UTC MJD); return whether to ring for something new."""
        standing = {(each.code, each.subject): each for each in causes}
        for key, known in list(self._known.items()):
            known.stands = key in standing
            is_quiet = (now_mjd - known.seen_mjd) * MINUTES_PER_DAY < QUIET_MIN
            is_done = known.acknowledged or known.cause.answers_itself
            if not known.stands and is_done and not (known.acknowledged and is_quiet):
                del self._known[key]
        rings = False
        for key, cause in standing.items():
            if key in self._known:
                self._known[key].cause, self._known[key].seen_mjd = cause, now_mjd
            else:
                self._known[key] = _Known(cause, now_mjd, now_mjd)
                rings = True
        return rings

    def acknowledge(self) -> Alarm | None:
        """Acknowledge the oldest alarm that waits for it; return it, None when none does."""
        for known in self._known.values():
            if not known.acknowledged:
                known.acknowledged = True
                return Alarm(known.cause, known.since_mjd, known.stands)
        return None


def causes_now(watch: Watch) -> tuple[Cause, ...]:
    """Return everything that calls for an alarm at this moment."""
    return (*_disk(watch), *_cautions(watch), *_run_over(watch), *_target(watch), *_night(watch))


def _disk(watch: Watch) -> list[Cause]:
    if watch.trouble is None:
        return []
    return [Cause("disk", "", "LOG NOT WRITTEN", watch.trouble)]


def _cautions(watch: Watch) -> list[Cause]:
    standing = cautions(watch.state, watch.planner.logbook.observatory.caution)
    return [Cause("caution", each.code, "CAUTION", each.sentence) for each in standing]


def _run_over(watch: Watch) -> list[Cause]:
    """Return that a run was finished and nothing was begun since."""
    state = watch.state
    last = next((e for e in reversed(state.events) if isinstance(e, RunStop)), None)
    if watch.stage is not Stage.READY or last is None or state.pointing is None:
        return []
    if last.n < state.pointing.n or last.why != "finished" or last.n in state.withdrawn:
        return []
    what = f"the run on {state.pointing.target} is finished"
    return [Cause("run_over", str(last.n), "RUN OVER", what, "space goes on", answers_itself=True)]


def _target(watch: Watch) -> list[Cause]:
    """Return what is about to end, or has ended, the time of the target the telescope is on."""
    pointing, plan, night = watch.state.pointing, watch.plan, watch.planner.night
    if pointing is None or plan is None or not pointing.on_target or plan.night is not night:
        return []
    try:
        index = night.target_index(pointing.target)
    except KeyError:
        return []
    now_mjd = watch.clock.now_mjd()
    at = night.index_at(now_mjd)
    found = []
    ahead = night.limits[index, at : at + int(LEAVING_MIN) + 1]
    if ahead.any():
        place = int((ahead != 0).argmax())
        why = reasons_in(int(ahead[place]))[0]
        minutes = (float(night.mjd[at + place]) - now_mjd) * MINUTES_PER_DAY
        when = f"in {minutes:.0f} min" if minutes > 0.5 else "now"
        found.append(
            Cause(
                "leaving",
                f"{pointing.target} {why.code}",
                "LEAVES ITS LIMITS",
                f"{pointing.target} {when}: {why.sentence}",
            )
        )
    step = next_in_run(watch.state)
    filter_ = watch.state.exposing.filter if watch.state.exposing else step.filter if step else None
    wheel = night.observatory
    if filter_ is not None and filter_ in {each.name for each in wheel.filters}:
        place = wheel.filter_index(filter_)
        limit = night.targets[index].maximum_image_size_arcsec
        if limit is not None and plan.outlook.soft[place, index, at]:
            size = float(plan.outlook.image_size_arcsec[place, index, at])
            found.append(
                Cause(
                    "soft",
                    f"{pointing.target} {filter_}",
                    "IMAGES TOO SOFT",
                    f'{pointing.target} in {filter_}: {size:.2f}", its limit {limit:.2f}"',
                )
            )
    return found


def _night(watch: Watch) -> list[Cause]:
    """Return that the seeing is old, and that the dark is about to end."""
    found = []
    now_mjd = watch.clock.now_mjd()
    at_work = watch.stage in (Stage.EXPOSING, Stage.BETWEEN, Stage.READY)
    known = [each.mjd for each in watch.state.seeing]
    begun = [each.start_mjd for each in watch.state.exposures]
    since_mjd = max(known) if known else min(begun, default=now_mjd)
    age_min = (now_mjd - since_mjd) * MINUTES_PER_DAY
    if at_work and age_min > STALE_MIN:
        said = "nothing measured for" if known else "nothing measured yet, and exposing for"
        found.append(
            Cause("stale", "", "SEEING IS OLD", f"{said} {age_min:.0f} min", "f measures the FWHM")
        )
    night = watch.planner.night
    at = night.index_at(now_mjd)
    ahead = np.asarray(night.dark[:, at : at + int(DAWN_MIN) + 1].any(axis=0))
    if at_work and ahead.size and ahead[0] and not ahead.all():
        minutes = int((~ahead).argmax())
        found.append(Cause("dawn", "", "DAWN", f"the last filter's dark ends in {minutes} min"))
    return found
