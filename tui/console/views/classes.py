"""The classes of the views by their names in the table. Importing this brings the engine."""

from __future__ import annotations

from tui.console.views.base import View
from tui.console.views.conditions import Conditions
from tui.console.views.image import Image
from tui.console.views.past import Past
from tui.console.views.records import Records
from tui.console.views.sky import Sky
from tui.console.views.targets import Targets

CLASSES: dict[str, type[View]] = {
    "sky": Sky,
    "conditions": Conditions,
    "image": Image,
    "log": Records,
    "targets": Targets,
    "past": Past,
}
