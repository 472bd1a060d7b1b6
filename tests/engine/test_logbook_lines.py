"""The lines of keys: against the standard parser on texts of every kind, and by definition."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.logbook import sample_logbook
from engine.logbook.lines import LineIndex, Path, lines_of_keys
from tests.engine.logbook_files import OBSERVATORY, TARGETS

ODD = '''\
# a comment with [brackets] and = signs

"b\\u00e9" . 'c d'.e = [1, 2, # a comment in a list
  { q = """a string
""\\" over ] } lines""""" , r='z' }, [[ ]], 1979-05-27 07:32:00Z,
]
[x.y]
k = \'\'\'a
'' b\'\'\'\'
[[t]]
n = "a # [b]"
[[t.u]]
m = 'it'
[[t.u]]
[t.u.v]
w = {a.b = 1, a.c = [ ]}
[[t]]
[[t.u]]
z = +1e5
"" = 1
'''


def paths_in(value: Any, path: Path = ()) -> Iterator[Path]:
    """Yield every path of keys and places in what the standard parser gives."""
    items: Any = ()
    if isinstance(value, dict):
        items = value.items()
    elif isinstance(value, list):
        items = enumerate(value)
    for part, inside in items:
        yield (*path, part)
        yield from paths_in(inside, (*path, part))


@pytest.mark.parametrize("ends", ["\n", "\r\n"])
def test_an_odd_text(ends: str) -> None:
    """Strings over lines, comments in lists, quoted keys, tables in lists: the lines by eye."""
    lines = lines_of_keys(ODD.replace("\n", ends))
    assert set(lines) == set(paths_in(tomllib.loads(ODD)))
    known: dict[Path, int] = {
        ("bé", "c d", "e"): 3,
        ("bé", "c d", "e", 2, "q"): 4,
        ("bé", "c d", "e", 2, "r"): 5,
        ("bé", "c d", "e", 4): 5,
        ("x", "y", "k"): 8,
        ("t", 0, "u", 1, "v", "w", "a", "c"): 16,
        ("t", 1): 17,
        ("t", 1, "u", 0, "z"): 19,
        ("t", 1, "u", 0, ""): 20,
    }
    assert {path: lines[path] for path in known} == known


@pytest.mark.parametrize("text", [OBSERVATORY, (sample_logbook() / "observatory.toml").read_text()])
def test_a_line_is_where_a_path_first_exists(text: str) -> None:
    """Where no value runs over lines: the shortest beginning, cut between lines, with the path."""
    lines = text.splitlines(keepends=True)
    seen: dict[Path, int] = {}
    for count in range(1, len(lines) + 1):
        for path in paths_in(tomllib.loads("".join(lines[:count]))):
            seen.setdefault(path, count)
    assert lines_of_keys(text) == seen


def test_a_path_that_is_not_there_gets_its_nearest_part() -> None:
    """A missing key is told on the line of its table; one without a table on the first."""
    index = LineIndex(TARGETS)
    assert index.line_of(("target", 1, "name")) == 19
    assert index.line_of(("target", 1, "magnitude")) == 18
    assert index.line_of(("target", 0, "exposures", 1, "filter")) == 14
    assert index.line_of(("site", "name")) == 1


KEYS = st.sampled_from(["a", "b-1", "k_2", '"x y"', "'q.r'", '"\\u00e9"', '"#="', "7", '"]"'])
SCALARS = st.sampled_from(
    ["1", "-0.5", "1e3", "true", "nan", '"s"', "'l#'", '"a\\"b]"', '"""m\n"x" ] """', "'''\n}'''",
     "2027-03-14T11:00:00Z", "2027-03-14 11:00:00", "07:32:00", "0xff", '""']
)  # fmt: skip
GAPS = st.sampled_from(["", " ", "\n", " # , ] }\n", "\t"])


@st.composite
def values(draw: st.DrawFn, depth: int = 2) -> str:
    """Draw a value as it may be written."""
    kind = draw(st.integers(0, 3 if depth else 1))
    if kind < 2:
        return draw(SCALARS)
    if kind == 2:
        gap, items = draw(GAPS), draw(st.lists(values(depth - 1), max_size=3))
        return f"[{gap}{f'{gap},{gap}'.join(items)}{gap}]"
    keys = draw(st.lists(KEYS, max_size=3, unique=True))
    return "{" + ", ".join(f"{key} = {draw(values(depth - 1))}" for key in keys) + "}"


@st.composite
def texts(draw: st.DrawFn) -> str:
    """Draw a text of statements, most of them TOML."""
    statements = []
    for _ in range(draw(st.integers(0, 7))):
        name = ".".join(draw(st.lists(KEYS, min_size=1, max_size=2)))
        form = draw(st.sampled_from(["[{}]", "[[{}]]", "{} = ", "{} = "]))
        statement = form.format(name)
        statements.append(statement + (draw(values()) if statement.endswith("= ") else ""))
    return "\n".join(statements) + draw(st.sampled_from(["", "\n", "\n# end"]))


@settings(max_examples=400, derandomize=True, deadline=None)
@given(text=texts())
def test_the_paths_found_are_the_parsers(text: str) -> None:
    """On any text that is TOML the walk finds the paths of the standard parser, in its lines."""
    try:
        parsed = tomllib.loads(text)
    except ValueError:
        return
    lines = lines_of_keys(text)
    assert set(lines) == set(paths_in(parsed))
    assert all(1 <= line <= text.count("\n") + 1 for line in lines.values())
