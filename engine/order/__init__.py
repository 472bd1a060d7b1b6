"""The order: what to point at next and after that, what it is worth, and why.

``build_problem`` makes the rest of a night ready, ``propose`` searches, ``retime`` and ``refine``
go on from an order in force, `Rules` are what the observer has decided. ``upper_limit`` proves how
much any order could be worth. The merit is in `engine.order.merit`, and nowhere else.
"""

from engine.order.bound import NoSolver, upper_limit
from engine.order.order import LeftOut, Order, PlacedExposures, Rules, Visit
from engine.order.problem import Problem, build_problem
from engine.order.propose import propose, refine, retime
from engine.order.travel import travel_of

__all__ = [
    "LeftOut",
    "NoSolver",
    "Order",
    "PlacedExposures",
    "Problem",
    "Rules",
    "Visit",
    "build_problem",
    "propose",
    "refine",
    "retime",
    "travel_of",
    "upper_limit",
]
