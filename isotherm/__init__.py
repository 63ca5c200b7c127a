"""A pressure-area trace becomes numbers, each with its uncertainty.

From Python: read a run sheet and a trace, analyse, and take what is needed. Results are frozen
dataclasses; every number in them is a `Quantity` with a standard uncertainty `u` and a unit.

>>> import isotherm
>>> sheet = isotherm.read_sheet("demo/spacer.toml")
>>> film = isotherm.analyse(isotherm.read_trace("demo/spacer_isotherm.txt", sheet), at=(20.0, 30.0))
>>> [phase.name for phase in film.headline.phases]
['gaseous', 'liquid-condensed', 'solid', 'collapsed']
>>> collapse = film.headline.collapse
>>> round(collapse.pressure.value), collapse.pressure.unit, collapse.kind
(54, 'mN/m', 'constant-area')
>>> 0 < collapse.pressure.u < 0.5
True

The same as pandas: a table of all features, or the smoothed curve.

>>> table = isotherm.to_frame(film)
>>> list(table.columns)
['branch', 'feature', 'value', 'u', 'u_random', 'u_systematic', 'unit']
>>> float(table.set_index("feature").value["limiting_area"].round(2))
0.22
>>> sorted(isotherm.curve_frame(film.headline))[:4]
['area', 'modulus', 'pressure', 'trough_area']

A film held at a pressure:

>>> held = isotherm.analyse_hold(isotherm.read_hold("demo/held_35.csv", sheet), sheet)
>>> [(hold.kind, hold.chosen) for hold in held.holds]
[('isobaric', 'desorption')]
>>> isotherm.to_frame(held).feature[0]
'pressure'

What goes wrong with an input is an `UpstrokeError`, with what, where and what to do.

>>> isotherm.read_trace("demo/nothing.txt", sheet)
Traceback (most recent call last):
isotherm.errors.UpstrokeError: demo/nothing.txt: ...
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from isotherm.analysis import analyse
    from isotherm.check import read_check
    from isotherm.cycles import analyse_cycles
    from isotherm.errors import UpstrokeError
    from isotherm.figures import isotherm_figure
    from isotherm.fluid import analyse_fluid
    from isotherm.frames import curve_frame, to_frame
    from isotherm.hold import analyse_hold
    from isotherm.hold_read import read_hold
    from isotherm.mixture import analyse_mixture
    from isotherm.oscillation import analyse_oscillation
    from isotherm.potential import analyse_potential
    from isotherm.quantity import Quantity, format_quantity
    from isotherm.replicates import analyse_replicates
    from isotherm.result import IsothermResult
    from isotherm.sheet import RunSheet
    from isotherm.sheet_read import read_sheet
    from isotherm.temperature import analyse_temperature
    from isotherm.trace import Trace
    from isotherm.trace_read import read_trace

__all__ = [
    "IsothermResult",
    "Quantity",
    "RunSheet",
    "Trace",
    "UpstrokeError",
    "analyse",
    "analyse_cycles",
    "analyse_fluid",
    "analyse_hold",
    "analyse_mixture",
    "analyse_oscillation",
    "analyse_potential",
    "analyse_replicates",
    "analyse_temperature",
    "curve_frame",
    "format_quantity",
    "isotherm_figure",
    "read_check",
    "read_hold",
    "read_sheet",
    "read_trace",
    "to_frame",
]

# Where each name lives; a module is imported when its name is first used, so that importing this is cheap.
_HOMES = {
    "IsothermResult": "result",
    "Quantity": "quantity",
    "RunSheet": "sheet",
    "Trace": "trace",
    "UpstrokeError": "errors",
    "analyse": "analysis",
    "analyse_cycles": "cycles",
    "analyse_fluid": "fluid",
    "analyse_hold": "hold",
    "analyse_mixture": "mixture",
    "analyse_oscillation": "oscillation",
    "analyse_potential": "potential",
    "analyse_replicates": "replicates",
    "analyse_temperature": "temperature",
    "curve_frame": "frames",
    "format_quantity": "quantity",
    "isotherm_figure": "figures",
    "read_check": "check",
    "read_hold": "hold_read",
    "read_sheet": "sheet_read",
    "read_trace": "trace_read",
    "to_frame": "frames",
}


def __getattr__(name: str) -> Any:
    """Import a public name when it is first used."""
    if name not in _HOMES:
        raise AttributeError(f"module 'isotherm' has no attribute '{name}'")
    value = getattr(import_module(f"isotherm.{_HOMES[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """Return the public names beside what is loaded."""
    return sorted({*globals(), *__all__})
