"""A night counted with tomllib alone: what the program's own answers are held against."""

from __future__ import annotations

import math
import tomllib
from collections import defaultdict
from pathlib import Path
from typing import Any


def by_tomllib(path: Path) -> dict[str, Any]:
    """Count one night with tomllib alone: amendments carried out by hand, nothing of ours used."""
    log = tomllib.loads(path.read_text(encoding="utf-8"))
    amendments = sorted(log.get("amendment", []), key=lambda each: each["n"])
    gone: set[int] = set()
    for each in reversed(amendments):
        if each["n"] in gone or each.get("with_n") in gone:
            gone.add(each["n"])
        elif each.get("withdrawn"):
            gone.add(each["of"])
    changes: dict[int, dict[str, Any]] = defaultdict(dict)
    for each in amendments:
        if each["n"] not in gone:
            left = ("n", "t", "of", "with_n", "why", "crc", "withdrawn")
            changes[each["of"]] |= {key: each[key] for key in each if key not in left}
    exposures = [each | changes[each["n"]] for each in log["exposure"] if each["n"] not in gone]
    counts: dict[Any, int] = defaultdict(int)
    credit: dict[Any, list[float]] = defaultdict(list)
    for each in exposures:
        key = (each["target"], each["filter"], each["seconds"], each["outcome"])
        counts[key] += 1
        credit[key].append(each.get("credit", 1.0))
    lost = log.get("lost_time", [])
    return {
        "entries": sum(len(each) for kind, each in log.items() if kind not in ("night", "site",
                       "telescope", "camera", "seeing", "caution", "filter", "header", "schema")),
        "exposures": len(exposures),
        "kept": sum(each["outcome"] == "good" for each in exposures),
        "open_s": math.fsum(each["exposed_s"] for each in exposures),
        "counts": dict(counts),
        "credit": {key: math.fsum(some) for key, some in credit.items()},
        "seeing": [each["seeing_arcsec"] for each in log["conditions"] if "seeing_arcsec" in each
                   and each["n"] not in gone],
        "lost_s": sum(
            (end["t"] - begin["t"]).total_seconds()
            for begin, end in zip(lost[::2], lost[1::2], strict=True)
        ),
    }  # fmt: skip
