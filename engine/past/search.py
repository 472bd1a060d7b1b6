"""Finding again: exposures and words by text, target, filter, night and condition."""

from __future__ import annotations

import re
from dataclasses import dataclass

from engine.past.digest import QUANTITIES, as_json
from engine.past.exposures import PAST_COLUMNS, PastExposure, limit
from engine.past.index import PastIndex
from engine.past.nights import ALWAYS, Period

# As many as a screen is searched for; None for all there are.
MOST = 200
NIGHTS_AT_ONCE = 16
# What a condition may be called, beside the log's own key.
SHORT = {
    "airmass": "airmass_mid",
    "altitude": "altitude_deg",
    "hour_angle": "hour_angle_h",
    "moon": "moon_separation_deg",
    "moon_altitude": "moon_altitude_deg",
    "image": "image_size_arcsec",
    "fwhm": "measured_fwhm_arcsec",
    "sky": "sky_mag_arcsec2",
    "seeing": "seeing_arcsec",
}
_CONDITION = re.compile(r"\s*([a-z_0-9]+)\s*(<=|>=|<|>)\s*([-+]?\d+(?:\.\d*)?|[-+]?\.\d+)\s*")


@dataclass(frozen=True, slots=True)
class Condition:
    """A limit to one quantity of an exposure: ``sign`` is <, <=, > or >=."""

    quantity: str
    sign: str
    value: float


def condition(text: str) -> Condition:
    """Return the condition a text such as ``airmass<1.5`` says; ValueError for anything else."""
    found = _CONDITION.fullmatch(text)
    name = SHORT.get(found[1], found[1]) if found else ""
    if found is None or name not in QUANTITIES:
        known = ", ".join(sorted({*SHORT, *QUANTITIES} - set(SHORT.values())))
        raise ValueError(f"expected a quantity, < or >, and a number; quantities are {known}")
    return Condition(name, found[2], float(found[3]))


@dataclass(frozen=True, slots=True)
class Wanted:
    """Which exposures are looked for; everything that is given must hold."""

    target: str = ""
    filter: str = ""
    period: Period = ALWAYS
    conditions: tuple[Condition, ...] = ()


@dataclass(frozen=True, slots=True)
class FoundWords:
    """Something an observer wrote: in which log, where, when (UTC MJD), about which target."""

    log: str
    n: int
    mjd: float | None
    kind: str
    target: str
    text: str

    @property
    def night(self) -> str:
        """The night in whose log it stands."""
        return self.log.removesuffix(".toml")


def find_words(
    index: PastIndex,
    text: str,
    period: Period = ALWAYS,
    target: str = "",
    most: int | None = MOST,
) -> tuple[FoundWords, ...]:
    """Return what was written with all words of a text in it, the newest first, at most so many.

    A word counts by its beginning, whatever its case and accents. Where SQLite has no full-text
    search, or the text has no word in it, the text as it stands is looked for.
    """
    about, params = ("AND words.target = ? ", (target,)) if target else ("", ())
    columns = "SELECT night.name, words.n, words.mjd, words.kind, words.target, words.text "
    rest = (
        f"AND night.name >= ? AND night.name <= ? {about}"
        "ORDER BY night.name DESC, words.n DESC LIMIT ?"
    )
    tail = (*period.limits, *params, limit(most))
    query = _full_text_query(text)
    if index.has_full_text and query:
        rows = index.ask(
            f"{columns} FROM words JOIN night ON night.id = words.night WHERE words.id IN "
            f"(SELECT rowid FROM words_found WHERE words_found MATCH ?) {rest}",
            (query, *tail),
        )
    else:
        rows = index.ask(
            f"{columns} FROM words JOIN night ON night.id = words.night "
            f"WHERE (words.text LIKE ? ESCAPE '\\' OR words.target LIKE ? ESCAPE '\\') {rest}",
            (_like(text), _like(text), *tail),
        )
    return tuple(FoundWords(*row) for row in rows)


def _full_text_query(text: str) -> str:
    """Return a text as a query that means nothing but its words; nothing when it has none."""
    words = re.findall(r"\w+", text)
    return " ".join(f'"{word}"*' for word in words if any(c.isalnum() for c in word))


def _like(text: str) -> str:
    return "%" + re.sub(r"([\\%_])", r"\\\1", text) + "%"


def find_exposures(
    index: PastIndex, wanted: Wanted, most: int | None = MOST
) -> tuple[PastExposure, ...]:
    """Return the exposures that are wanted, the newest first, at most so many.

    For one target by its own list; else night by night, only those whose filters and extremes allow
    what is wanted, until there are enough.
    """
    clauses: list[str] = []
    params: list[object] = []
    for name, value in (("target", wanted.target), ("filter", wanted.filter)):
        if value:
            clauses.append(f"e.{name} = ?")
            params.append(value)
    for each in wanted.conditions:
        clauses.append(f"e.{each.quantity} {each.sign} ?")
        params.append(each.value)
    such = " AND ".join(clauses) or "1"
    newest = "ORDER BY night.name DESC, e.place DESC LIMIT ?"
    if wanted.target:
        rows = index.ask(
            f"SELECT {PAST_COLUMNS} FROM exposure e INDEXED BY exposure_of_target "
            "JOIN night ON night.id = e.night AND night.name >= ? AND night.name <= ? "
            f"WHERE {such} {newest}",
            (*wanted.period.limits, *params, limit(most)),
        )
        return tuple(PastExposure(*row) for row in rows)
    found: list[PastExposure] = []
    possible = _possible_nights(index, wanted)
    for begin in range(0, len(possible), NIGHTS_AT_ONCE):
        some = possible[begin : begin + NIGHTS_AT_ONCE]
        rows = index.ask(
            f"SELECT {PAST_COLUMNS} FROM night CROSS JOIN exposure e "
            "INDEXED BY exposure_of_night ON e.night = night.id "
            f"WHERE night.id IN ({', '.join('?' * len(some))}) AND {such} {newest}",
            (*some, *params, limit(None if most is None else most - len(found))),
        )
        found += [PastExposure(*row) for row in rows]
        if most is not None and len(found) >= most:
            break
    return tuple(found)


def _possible_nights(index: PastIndex, wanted: Wanted) -> list[int]:
    """Return the nights that may hold what is wanted, the newest first."""
    rows = index.ask(
        "SELECT id, filters FROM night WHERE name >= ? AND name <= ? ORDER BY name DESC",
        wanted.period.limits,
    )
    named = as_json(wanted.filter)
    nights = [night for night, filters in rows if not wanted.filter or named in filters]
    for each in wanted.conditions:
        end = "least" if each.sign.startswith("<") else "most"
        allow = {
            night
            for (night,) in index.ask(
                f"SELECT night FROM extent WHERE quantity = ? AND {end} {each.sign} ?",
                (each.quantity, each.value),
            )
        }
        nights = [night for night in nights if night in allow]
    return nights
