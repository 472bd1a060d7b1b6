"""How the console looks: palettes by role, and filters over everything drawn."""

from tui.look.filters import CleanFilter, MonoFilter, RedFilter
from tui.look.palette import LOOKS, ROLES, Look

__all__ = ["LOOKS", "ROLES", "CleanFilter", "Look", "MonoFilter", "RedFilter"]
