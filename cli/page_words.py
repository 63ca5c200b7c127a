"""What each kind of result answers: its question, its answer in a few facts, and its tables."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from cli.page_blocks import Fact, Table, generic_tables, pair_text, quantity_text, told
from cli.page_words_build import audit_answer, audit_tables, transfer_answer, transfer_tables
from cli.page_words_series import (
    cycles_answer,
    fluid_answer,
    mixture_answer,
    oscillation_answer,
    potential_answer,
    replicates_answer,
    replicates_tables,
    temperature_answer,
)

__all__ = ["answer_of", "kind_of", "question_of", "tables_of"]

QUESTIONS = {
    "check": "Are surface, probe and barriers fit for a film to be spread?",
    "isotherm": "How does this film behave when it is compressed: where does it lift off, change "
    "phase and collapse, and how stiff is it?",
    "hold": "How much of the film is lost while it is held, and by which law?",
    "cycles": "What do repeated compression and expansion cost, and how far does the isotherm move?",
    "fluid": "Does the fluid branch follow an equation of state, and with which co-area?",
    "oscillation": "How stiff and how lossy is the film under oscillating barriers?",
    "potential": "Which effective dipole moment goes with the surface potential?",
    "target": "At which surface pressure should this film be dipped, and how much film does it take?",
    "transfer": "How much film went over on every stroke, and what do the strokes add up to?",
    "audit": "Is the build what it was designed to be?",
    "batch": "What does each of these runs say, in one row?",
    "replicates": "What do the repeated runs say together, and does one of them stand apart?",
    "mixture": "Do the components mix, and what does mixing change?",
    "temperature": "How do the transition and the features move with temperature?",
}


def kind_of(payload: dict[str, Any]) -> str:
    """Return the kind of a result: upstroke.isotherm/1 is an isotherm."""
    return str(payload.get("schema", "")).partition(".")[2].partition("/")[0] or "result"


def question_of(payload: dict[str, Any]) -> str:
    """Return the question a result answers."""
    return QUESTIONS.get(kind_of(payload), "What was found?")


def answer_of(payload: dict[str, Any]) -> list[Fact]:
    """Return the answer in a few facts, each with its uncertainty."""
    make = ANSWERS.get(kind_of(payload))
    if make is not None:
        return make(payload)
    return [
        Fact(" ".join(key.split("_")), quantity_text(value))
        for key, value in payload.items()
        if isinstance(value, dict) and "unit" in value and value.get("value") is not None
    ][:8]


def tables_of(payload: dict[str, Any]) -> list[Table]:
    """Return the tables of a result."""
    make = TABLES.get(kind_of(payload))
    return generic_tables(payload) if make is None else make(payload)


def _headline(payload: dict[str, Any]) -> dict[str, Any]:
    branches: list[dict[str, Any]] = payload["branches"]
    return next((b for b in branches if b["direction"] == "compression"), branches[0])


def _isotherm_answer(payload: dict[str, Any]) -> list[Fact]:
    branch = _headline(payload)
    facts = [Fact("lift-off area", quantity_text(branch["lift_off"]))] if branch["lift_off"] else []
    for item in branch["transitions"]:
        for name, point in (
            ("kink", item.get("at")),
            ("coexistence begins", item.get("onset")),
            ("coexistence ends", item.get("end")),
        ):
            if point:
                facts.append(
                    Fact(
                        name, quantity_text(point["pressure"]), f"at {quantity_text(point['area'])}"
                    )
                )
    collapse = branch["collapse"]
    if collapse:
        facts.append(
            Fact(
                "collapse",
                quantity_text(collapse["pressure"]),
                f"{collapse['kind']}, at {quantity_text(collapse['area'])}",
            )
        )
    elif branch["direction"] == "compression":
        facts.append(Fact("collapse", "not reached", f"Π ≥ {told(branch['highest_pressure'])}"))
    if branch["limiting_area"]:
        facts.append(Fact("limiting area", quantity_text(branch["limiting_area"])))
    if branch["modulus_max"]:
        top = branch["modulus_max"]
        facts.append(
            Fact(
                "largest modulus",
                quantity_text(top["modulus"]),
                f"at {quantity_text(top['pressure'])}",
            )
        )
    return facts


def _isotherm_tables(payload: dict[str, Any]) -> list[Table]:
    tables = []
    for branch in payload["branches"]:
        name = f"{branch['direction']} {branch['cycle']}"
        phases = tuple(
            (
                p["name"],
                pair_text(p["area"], digits=3),
                pair_text(p["pressure"]),
                told(p["modulus"]),
            )
            for p in branch["phases"]
        )
        tables.append(
            Table(f"Phases, {name}", ("phase", "area, nm²", "pressure, mN/m", "modulus"), phases)
        )
        at = tuple(
            (f"{a['pressure']:g} mN/m", told(a["area"]), told(a["modulus"]))
            for a in branch["area_at"]
        )
        tables.append(Table(f"At chosen pressures, {name}", ("pressure", "area", "modulus"), at))
        rest = (
            ("zero subtracted", told(branch["zero_offset"])),
            ("noise of one row", f"{branch['noise']:.2g} mN/m"),
            ("rows", f"{branch['rows']:,}"),
        )
        tables.append(Table(f"The record, {name}", ("quantity", "value"), rest))
    return tables


def _hold_answer(payload: dict[str, Any]) -> list[Fact]:
    facts = []
    for hold in payload["holds"]:
        name = f"hold {hold['number']}, {quantity_text(hold['pressure'])}"
        over = payload.get("planned_time_s")
        if hold["loss_planned"] and over:
            loss = quantity_text(hold["loss_planned"], factor=100.0, unit="%")
            facts.append(Fact(f"{name}: loss over {over / 60:.3g} min, as planned", loss))
        loss = quantity_text(hold["loss_hold"], factor=100.0, unit="%")
        facts.append(
            Fact(
                f"{name}: loss over the hold",
                loss,
                f"{hold['duration_s'] / 60:.3g} min, law: {hold['model']}",
            )
        )
    return facts


def _hold_tables(payload: dict[str, Any]) -> list[Table]:
    tables = []
    for hold in payload["holds"]:
        rates = tuple(
            (
                f"{rate['time_s'] / 60:.3g} min",
                quantity_text(rate["rate"], factor=360000.0, unit="%/h"),
            )
            for rate in hold["rates"]
        )
        caption = f"Rate of loss, hold {hold['number']}"
        tables.append(Table(caption, ("after", "rate"), rates))
        laws = tuple(
            (law.get("name", ""), f"{law.get('weight', 0.0):.2f}") for law in hold["models"]
        )
        tables.append(Table(f"Support of each law, hold {hold['number']}", ("law", "weight"), laws))
    return tables


def _target_answer(payload: dict[str, Any]) -> list[Fact]:
    if payload["recommended"] is None:
        return [Fact("dip at", "no pressure meets every limit", payload["binding"])]
    facts = [
        Fact("dip at", quantity_text(payload["recommended"]), payload["binding"]),
        Fact("window", pair_text(payload["window"], "mN/m")),
    ]
    for label, key in (("packing error there", "packing_error"), ("film lost meanwhile", "loss")):
        if payload[key]:
            facts.append(Fact(label, quantity_text(payload[key], factor=100.0, unit="%")))
    if payload["strokes_possible"] is not None:
        facts.append(Fact("strokes one filling serves", f"{payload['strokes_possible']}"))
    if payload["renewals"] is not None:
        facts.append(Fact("renewals needed", f"{payload['renewals']}"))
    asked = payload.get("asked")
    if asked:
        verdict = "meets every rule" if asked["admissible"] else "breaks a rule"
        facts.append(
            Fact(f"the sheet's {asked['pressure']:g} mN/m", verdict, ", ".join(asked["breaks"]))
        )
    return facts


def _target_tables(payload: dict[str, Any]) -> list[Table]:
    limits = tuple(
        (
            limit["label"],
            pair_text(limit["allowed"]) if limit["allowed"] else "nothing",
            "yes" if limit["binding"] else "",
            limit["reason"],
        )
        for limit in payload["limits"]
    )
    tables = [Table("What each rule allows", ("rule", "allows, mN/m", "binds", "because"), limits)]
    plan = tuple(
        (
            f"{row['stroke']}",
            row["direction"],
            told(row["film_removed"]),
            told(row["area_at_end"]),
            "renew before" if row["renew_before"] else "",
        )
        for row in payload["plan"]
    )
    if plan:
        columns = ("stroke", "way", "removes", "trough area after it", "")
        tables.append(Table("Plan", columns, plan))
    told_cautions = tuple((c["found"] or "", c["text"]) for c in payload["cautions"])
    if told_cautions:
        tables.append(Table("Cautions", ("concerns", "usual caution"), told_cautions))
    return tables


def _check_answer(payload: dict[str, Any]) -> list[Fact]:
    facts = [Fact("verdict", payload["verdict"])]
    return facts + [
        Fact(item["name"], told(item["value"]), item["verdict"]) for item in payload["items"]
    ]


ANSWERS: dict[str, Callable[[dict[str, Any]], list[Fact]]] = {
    "isotherm": _isotherm_answer,
    "hold": _hold_answer,
    "target": _target_answer,
    "check": _check_answer,
    "cycles": cycles_answer,
    "fluid": fluid_answer,
    "mixture": mixture_answer,
    "oscillation": oscillation_answer,
    "potential": potential_answer,
    "replicates": replicates_answer,
    "temperature": temperature_answer,
    "transfer": transfer_answer,
    "audit": audit_answer,
}
TABLES: dict[str, Callable[[dict[str, Any]], list[Table]]] = {
    "isotherm": _isotherm_tables,
    "hold": _hold_tables,
    "target": _target_tables,
    "replicates": replicates_tables,
    "transfer": transfer_tables,
    "audit": audit_tables,
}
