"""Picture of one log with what is true and what was found, to understand a failure."""

from __future__ import annotations

from pathlib import Path

from transfer_matching import Match, Reading
from transfer_truth import SimulatedLog, Truth

__all__ = ["draw_log"]


def draw_log(path: Path, log: SimulatedLog, truth: Truth, reading: Reading, match: Match) -> None:
    """Write a PNG: reading, area, pressure and TR; true strokes shaded, found ones as bars."""
    import matplotlib

    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    figure, axes = plt.subplots(4, 1, figsize=(13, 11), sharex=True)
    columns = ((log.position, "reading / mm"), (log.area, "area / cm²"), (log.pressure, "Π / mN/m"))
    for axis, (values, name) in zip(axes, columns, strict=False):
        axis.plot(log.time, values, lw=0.7, color="black")
        axis.set_ylabel(name)
        for s in truth.strokes:
            axis.axvspan(s.start, s.end, alpha=0.25 if s.judgeable else 0.1, lw=0,
                         color="tab:orange" if s.direction == "down" else "tab:green")  # fmt: skip
        for begin, end in truth.renewals:
            axis.axvspan(begin, end, color="tab:red", alpha=0.12, lw=0)
    axes[0].axhline(truth.contact, color="tab:blue", lw=0.6)
    if reading.contact is not None:
        axes[0].axhline(reading.contact[0], color="tab:red", lw=0.6, ls="--")
    low, high = axes[0].get_ylim()
    for found in reading.strokes:
        level = high if found.direction == "down" else low
        axes[0].plot([found.start, found.end], [level, level], lw=4, color="tab:purple")
    middles = [0.5 * (s.start + s.end) for s in truth.strokes]
    axes[3].plot(middles, [s.ratio for s in truth.strokes], "k_", ms=14, label="true")
    shown = [f for f in reading.strokes if f.ratio is not None]
    axes[3].errorbar([0.5 * (f.start + f.end) for f in shown], [f.ratio or 0.0 for f in shown],
                     [2.0 * (f.u or 0.0) for f in shown], fmt="o", ms=4, color="tab:purple",
                     label="found ± 2u")  # fmt: skip
    axes[3].set_ylabel("TR")
    axes[3].set_xlabel("time / s")
    axes[3].legend()
    worst = max(match.errors, key=lambda e: abs(e.error), default=None)
    text = "" if worst is None else f"worst TR error {worst.error:+.4f} (stroke {worst.number})"
    axes[0].set_title(
        f"{truth.family} seed {truth.seed}: {', '.join(truth.traits)}; M {truth.modulus:.0f} mN/m\n"
        f"missed {match.missed}, invented {match.invented}, type {truth.type} read {reading.type}, "
        f"drop after {truth.drop_after} read {match.change_found}; {text} {reading.error}",
        fontsize=9,
    )
    figure.tight_layout()
    figure.savefig(path, dpi=75)
    plt.close(figure)
