"""One trace as a picture: rows, noise-free curve, truth and what was found."""

from __future__ import annotations

from pathlib import Path

from isotherm_marks import Marks
from isotherm_simulator import make_film
from isotherm_truth import TruePoint, Truth

from isotherm.result import Branch, Point
from isotherm.trace import Trace

__all__ = ["plot_trace"]


def _knees(truth: Truth) -> list[tuple[str, TruePoint]]:
    out: list[tuple[str, TruePoint]] = []
    for t in truth.transitions:
        out += [(n, p) for n, p in (("onset", t.onset), ("end", t.end), ("kink", t.at)) if p]
    if truth.collapse is not None:
        out.append(("collapse", TruePoint(truth.collapse.area, truth.collapse.pressure)))
    return out


def _found(branch: Branch) -> list[tuple[str, Point]]:
    out: list[tuple[str, Point]] = []
    for t in branch.transitions:
        out += [(n, p) for n, p in (("onset", t.onset), ("end", t.end), ("kink", t.at)) if p]
    if branch.collapse is not None:
        out.append(("collapse", Point(branch.collapse.area, branch.collapse.pressure)))
    return out


def plot_trace(
    folder: Path, trace: Trace, truth: Truth, branch: Branch | None, marks: Marks, asked: str
) -> Path:
    """Draw one marked trace to `folder`; `asked` is the family the seed was simulated with."""
    import matplotlib

    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    figure, (top, low) = plt.subplots(2, 1, figsize=(10, 9), sharex=True, height_ratios=(3, 1))
    film, _ = make_film(marks.seed, asked)
    size = 6 if trace.area.size < 200 else 2
    top.plot(trace.area, trace.pressure, ".", ms=size, color="0.55")
    top.plot(film.area, film.pressure, "k-", lw=0.7)
    for name, true in _knees(truth):
        top.plot(true.area, true.pressure, "bo", mfc="none", ms=11)
        top.annotate(f"true {name}", (true.area, true.pressure), (12, 10), color="b",
                     textcoords="offset points", fontsize=8)  # fmt: skip
    if truth.lift_off is not None:
        top.axvline(truth.lift_off, color="b", lw=0.7)
    if branch is not None:
        for name, found in _found(branch):
            top.errorbar(found.area.value, found.pressure.value, xerr=2 * (found.area.u or 0),
                         yerr=2 * (found.pressure.u or 0), fmt="rx", ms=9)  # fmt: skip
            top.annotate(f"found {name}", (found.area.value, found.pressure.value), (12, -14),
                         color="r", textcoords="offset points", fontsize=8)  # fmt: skip
        if branch.lift_off is not None:
            top.axvline(branch.lift_off.value, color="r", lw=0.7, ls="--")
        curve = branch.curve
        low.plot(curve.area, curve.modulus, "r-", lw=0.8)
        low.set_ylim(-20, 1.3 * max(20.0, branch.modulus_max.modulus.value
                                    if branch.modulus_max else 100.0))  # fmt: skip
    low.axhline(12.5, color="0.7", lw=0.5)
    low.set_xlabel("area per molecule, nm²")
    low.set_ylabel("modulus, mN/m")
    top.set_ylabel("surface pressure, mN/m")
    about = ", ".join(f"{k} {v:.3g}" for k, v in truth.settings.items() if not isinstance(v, str))
    top.set_title(
        f"{marks.family} {marks.seed} ({marks.generator})\n{about}\n"
        f"true: {marks.expected}   found: {marks.error or marks.called}",
        fontsize=7,
    )
    figure.tight_layout()
    path = folder / f"{asked}_{marks.seed}.png"
    figure.savefig(path, dpi=70)
    plt.close(figure)
    return path
