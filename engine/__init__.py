"""The engine: everything warmroom knows about the sky, the telescope and the night.

It imports no user interface. Rooms, in the order in which the night's data flows through them:

logbook    the folder's files, checked, as ``Observatory`` and ``Target``
positions  where everything is: Earth rotation, stars, Sun, Moon, twilight, refraction, airmass
image      how large star images will be, per filter, and which blur is to blame
seeing     the seeing now and its forecast, from what was measured
light      sky brightness, signal to noise, saturation, what an exposure is worth
night      the night's tables: all of the above for every target and minute, and the limits
order      what to point at next, and after that
log        the night on disk: blocks, recovery, and the state as a fold over its events
past       many nights: an index over their logs, and the questions it answers
report     one night, reported
watch      the observer's acts turned into events; the live night
rehearsal  an invented night and somebody who observes it
"""
