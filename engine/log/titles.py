"""One plain line for each event: what the log view shows."""

from __future__ import annotations

from engine.log.events import (
    Amendment,
    Calibration,
    ClockStep,
    Close,
    Conditions,
    Event,
    Exposure,
    ExposureStart,
    Focus,
    Foreign,
    LostTime,
    Note,
    OrderProposed,
    Override,
    Pointing,
    Recovery,
    RunStart,
    RunStop,
    TargetAdded,
)
from engine.log.vocabulary import LOST_CAUSES, OUTCOMES, OVERRIDES
from engine.logbook.text import one_line

_LABELS = {word.value: word.label for word in (*OUTCOMES, *LOST_CAUSES, *OVERRIDES)}

# Key of `Conditions`, how it is shown.
_CONDITIONS = (
    ("seeing_arcsec", 'seeing {:.2f}"'),
    ("measured_fwhm_arcsec", 'from a FWHM of {:.2f}"'),
    ("cloud_percent", "cloud {:g} %"),
    ("wind_m_per_s", "wind {:g} m/s"),
    ("humidity_percent", "humidity {:g} %"),
    ("temperature_c", "temperature {:g} °C"),
    ("dew_point_c", "dew point {:g} °C"),
    ("pressure_hpa", "pressure {:g} hPa"),
    ("sky_mag_arcsec2", "sky {:.2f} mag"),
)


def title(event: Event) -> str:
    """Return an event as one line of plain text, safe for a terminal."""
    return one_line(_title(event), 400)


def _title(event: Event) -> str:
    match event:
        case RunStart():
            return f"run on {event.target}: {_steps(event)}"
        case RunStop():
            return "run over" + _because(event.why)
        case Pointing():
            return f"on target {event.target}" if event.on_target else f"to {event.target}"
        case ExposureStart():
            return f"{event.filter} {event.seconds:g} s on {event.target} begins"
        case Exposure():
            return _exposure(event)
        case Conditions():
            said = [
                form.format(value)
                for key, form in _CONDITIONS
                if (value := getattr(event, key)) is not None
            ]
            return ", ".join(said) or "conditions"
        case LostTime():
            cause = _LABELS.get(event.cause, event.cause)
            return f"lost time begins: {cause}" if event.phase == "begin" else "lost time ends"
        case _:
            return _rarer(event)


def _rarer(event: Event) -> str:
    match event:
        case Note():
            return f"note: {event.text}"
        case OrderProposed():
            return f"order: {', '.join(event.targets[:4]) or 'nothing'}" + _because(event.why)
        case Override():
            what = _LABELS.get(event.action, event.action)
            instead = f" instead of {event.instead_of}" if event.instead_of else ""
            return f"{what}: {event.target or event.filter}{instead}" + _because(event.why)
        case TargetAdded():
            where = f"ra {event.ra_deg:.5f}° dec {event.dec_deg:+.5f}°"
            return f"target {event.name} added: {where}, {_steps(event)}" + _because(event.why)
        case Amendment():
            said = ", ".join(f"{key} = {value}" for key, value in event.changes.items())
            done = "withdrawn" if event.withdrawn else said
            return f"entry {event.of} {done}" + _because(event.why)
        case Focus():
            return _focus(event)
        case Calibration():
            return _calibration(event)
        case ClockStep():
            return f"the computer's clock jumped {event.seconds:+.1f} s" + _because(event.why)
        case Recovery():
            return f"recovered: {event.removed_bytes} torn bytes set aside in {event.set_aside}"
        case Close():
            return "closed" + _because(event.why)
        case Foreign():
            return f"{event.kind_in_file} ({event.complaint})"
        case _:
            return event.kind


def _steps(event: RunStart | TargetAdded) -> str:
    steps = zip(event.filters, event.seconds, event.counts, strict=False)
    return ", ".join(f"{name} {seconds:g} s × {count}" for name, seconds, count in steps)


def _exposure(event: Exposure) -> str:
    parts = [f"{event.filter} {event.seconds:g} s on {event.target}"]
    if event.airmass_mid is not None:
        parts.append(f"airmass {event.airmass_mid:.2f}")
    if event.image_size_arcsec is not None:
        parts.append(f'{event.image_size_arcsec:.2f}" predicted')
    if event.measured_fwhm_arcsec is not None:
        parts.append(f'{event.measured_fwhm_arcsec:.2f}" measured')
    if event.credit is not None:
        parts.append(f"worth {event.credit:.2f}")
    parts.append(_LABELS.get(event.outcome, event.outcome))
    return ", ".join(parts) + _because(event.why)


def _focus(event: Focus) -> str:
    parts = [
        f"focus at {event.position:g}" if event.position is not None else "focus",
        event.filter,
        f'FWHM {event.fwhm_arcsec:.2f}"' if event.fwhm_arcsec is not None else "",
        f"{event.temperature_c:g} °C" if event.temperature_c is not None else "",
    ]
    return ", ".join(part for part in parts if part)


def _calibration(event: Calibration) -> str:
    seconds = f"{event.seconds:g} s" if event.seconds is not None else ""
    level = f"at {event.level_adu:g} adu" if event.level_adu is not None else ""
    parts = [f"calibration: {event.what}", event.filter, seconds, f"× {event.count}", level]
    return " ".join(part for part in parts if part)


def _because(why: str) -> str:
    return f": {why}" if why else ""
