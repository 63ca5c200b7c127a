"""A dipping log becomes a verdict, stroke by stroke.

From Python: read a run sheet and a dipping log, and take what the strokes say. The film's isotherm,
analysed with the package `isotherm`, gives its modulus.

>>> import isotherm, transfer
>>> sheet = isotherm.read_sheet("demo/build_failing.toml")
>>> film = isotherm.analyse(isotherm.read_trace("demo/spacer_isotherm.txt", sheet), at=(30.0,))
>>> build = transfer.analyse_log(
...     transfer.read_log("demo/build_failing.csv", sheet), sheet, isotherm=film
... )
>>> len(build.strokes), build.deposition.type, build.drift.changes
(20, 'Y', (10,))
>>> [stroke.ratio.value > 0.95 for stroke in build.strokes[8:12]]
[True, True, False, False]
>>> round(build.stack.layers.value), build.stack.layers.u < 0.3
(16, True)

The strokes as a pandas table:

>>> table = transfer.to_frame(build)
>>> table.groupby("direction").ratio.count().to_dict()
{'down': 10, 'up': 10}

The pressure to dip at, from the isotherm and a hold:

>>> plan = isotherm.read_sheet("demo/spacer.toml")
>>> held = [isotherm.analyse_hold(isotherm.read_hold(f"demo/held_{p}.csv", plan), plan) for p in (35, 45)]
>>> choice = transfer.choose_target(film, plan, holds=tuple(held))
>>> 26 < choice.window.low < choice.recommended.value < choice.window.high < 42
True
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from transfer.analysis import analyse_log
    from transfer.evidence import evidence_for
    from transfer.evidence_result import EvidenceResult
    from transfer.film_reading import film_reading
    from transfer.frames import to_frame
    from transfer.log import DippingLog, read_log
    from transfer.result import TransferResult
    from transfer.target import choose_target
    from transfer.target_result import TargetResult

__all__ = [
    "DippingLog",
    "EvidenceResult",
    "TargetResult",
    "TransferResult",
    "analyse_log",
    "choose_target",
    "evidence_for",
    "film_reading",
    "read_log",
    "to_frame",
]

# Where each name lives; a module is imported when its name is first used, so that importing this is cheap.
_HOMES = {
    "DippingLog": "log",
    "EvidenceResult": "evidence_result",
    "TargetResult": "target_result",
    "TransferResult": "result",
    "analyse_log": "analysis",
    "choose_target": "target",
    "evidence_for": "evidence",
    "film_reading": "film_reading",
    "read_log": "log",
    "to_frame": "frames",
}


def __getattr__(name: str) -> Any:
    """Import a public name when it is first used."""
    if name not in _HOMES:
        raise AttributeError(f"module 'transfer' has no attribute '{name}'")
    value = getattr(import_module(f"transfer.{_HOMES[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """Return the public names beside what is loaded."""
    return sorted({*globals(), *__all__})
