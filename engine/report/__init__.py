"""The report of one night: what a principal investigator, a reducer and the next observer ask.

``night_report`` makes it from the night's log alone, so that it can be made years later; the log's
header says what the observatory was. ``save`` writes it in the form that a file's ending asks for.
"""

from engine.report.night import FilterTotal, NightReport, Quantity, night_report
from engine.report.save import FORMS, save

__all__ = ["FORMS", "FilterTotal", "NightReport", "Quantity", "night_report", "save"]
