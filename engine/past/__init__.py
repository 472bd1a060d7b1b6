"""Past nights: an index over all logs of a logbook, and the questions it answers."""

from engine.past.carry import done_before
from engine.past.index import PastIndex, index_path

__all__ = ["PastIndex", "done_before", "index_path"]
