"""What series of runs and the rarer measurements answer, in facts and tables."""

from __future__ import annotations

from typing import Any

from cli.page_blocks import Fact, Table, label_of, quantity_text, told

__all__ = [
    "cycles_answer",
    "fluid_answer",
    "mixture_answer",
    "oscillation_answer",
    "potential_answer",
    "replicates_answer",
    "replicates_tables",
    "temperature_answer",
]


def replicates_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return the means of the first features, and who stands apart."""
    apart = [run["name"] for run in payload["runs"] if run["outlying"]]
    facts = [Fact("runs", f"{len(payload['runs'])}"), Fact("standing apart", told(apart or "none"))]
    return facts + [
        Fact(label_of(f["name"]), told(f["mean"]), f"mean of {f['n']}")
        for f in payload["features"][:6]
    ]


def replicates_tables(payload: dict[str, Any]) -> list[Table]:
    """Return the runs and every feature."""
    runs = tuple(
        (r["name"], told(r["kept"]), told(r["outlying"]), told(r["reasons"]))
        for r in payload["runs"]
    )
    features = tuple(
        (label_of(f["name"]), told(f["n"]), told(f["mean"]), told(f["s"]))
        for f in payload["features"]
    )
    return [
        Table("Runs", ("run", "kept", "stands apart", "because"), runs),
        Table("Features", ("feature", "runs", "mean", "standard deviation"), features),
    ]


def mixture_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return the verdict at every pressure, and what the phase rule says."""
    facts = [
        Fact(f"areas at {at['pressure']:g} mN/m", at["verdict"], at["statement"])
        for at in payload["at"]
    ]
    return facts + [
        Fact(f"{rule['kind']} pressure", rule["reading"], rule["statement"])
        for rule in payload["phase_rule"]
    ]


def temperature_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return slope and heat of the transition, and where it closes."""
    facts = [Fact("slope of the transition", quantity_text(payload["transition_slope"]))]
    for run in payload["runs"]:
        heat = run.get("heat")
        if heat:
            facts.append(Fact(f"heat, {run['name']}", told(heat["enthalpy"]), told(run["kelvin"])))
    for point in payload["critical"]:
        facts.append(Fact(f"critical temperature, {point['law']}", told(point["kelvin"])))
    return facts


def fluid_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return co-area and cohesion, and whether the equation holds."""
    fit = payload.get("lower_part") or payload["whole_branch"]
    facts = [Fact("does the equation hold?", told(bool(fit["holds"])), payload["statement"])]
    facts += [Fact("co-area", told(fit["co_area"])), Fact("cohesion", told(fit["cohesion"]))]
    limit = payload.get("gaseous_limit")
    if limit:
        facts.append(Fact("Π A / kT at zero pressure", told(limit["ratio"]), limit["reading"]))
    return facts


def potential_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return the onset and the moment at the named places."""
    onset = payload.get("onset")
    facts = [Fact("potential begins at", told(onset["area"]), onset["reading"])] if onset else []
    return facts + [
        Fact(f"moment, {at['name']}", told(at["moment"]), f"at {at['area']:.4g} nm²")
        for at in payload["at"]
    ]


def oscillation_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return storage and loss of every stretch."""
    facts = []
    for stretch in payload["segments"]:
        name = f"at {told(stretch['frequency'])}"
        remark = "linear" if stretch["linear"] else "not linear"
        facts.append(Fact(f"storage, {name}", told(stretch["storage"]), remark))
        facts.append(Fact(f"loss, {name}", told(stretch["loss"])))
    return facts


def cycles_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return hysteresis and lost part of every cycle."""
    return [
        Fact(
            f"hysteresis, cycle {cycle['number']}",
            told(cycle["hysteresis"]["molar"]),
            f"lost part {told(cycle['lost_part'])}",
        )
        for cycle in payload["cycles"]
        if cycle.get("hysteresis")
    ]
