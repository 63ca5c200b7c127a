"""Draw what is built: substrate, ratio of every stroke, deposition type. No physics, no time here."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from transfer_truth import Body

__all__ = ["Build", "decidable_type", "draw_body", "draw_build"]

DROP = 0.8  # a "20 % drop": later strokes take this part of what the earlier ones took
KINDS = ("Y", "X", "Z", "XY", "fading", "drop", "peel", "wetting")
KIND_SHARES = (0.30, 0.10, 0.10, 0.10, 0.10, 0.12, 0.06, 0.12)


@dataclass(frozen=True)
class Build:
    """ratios : (n,) TR intended for each stroke; first : direction of stroke 1; drop_after : or None.

    one_sided : only every other stroke after the drop takes less, those of one direction.
    """

    kind: str
    type: str
    first: str
    ratios: NDArray[np.float64]
    drop_after: int | None
    steady: bool
    one_sided: bool = False

    def direction(self, index: int) -> str:
        """Direction of stroke `index` (from 0)."""
        other = "up" if self.first == "down" else "down"
        return self.first if index % 2 == 0 else other


def draw_body(rng: np.random.Generator) -> Body:
    """Plate of 10–40 mm or rod of 8–20 mm, sizes in 0.1 mm as a caliper gives them."""
    if rng.random() < 0.25:
        return Body("rod", diameter=round(float(rng.uniform(8.0, 20.0)), 1))
    return Body(
        "plate",
        width=round(float(rng.uniform(10.0, 40.0)), 1),
        thickness=round(float(rng.uniform(0.3, 3.0)), 1),
    )


def _count(rng: np.random.Generator, kind: str) -> int:
    if kind == "drop":
        return int(rng.integers(10, 33))
    if kind == "peel":
        return int(rng.integers(8, 25))
    if kind == "fading":
        return int(rng.integers(6, 33))
    share = rng.random()
    if share < 0.15:
        return int(rng.integers(1, 4))
    return int(rng.integers(4, 13)) if share < 0.65 else int(rng.integers(13, 33))


def draw_build(rng: np.random.Generator) -> Build:
    """Draw kind, number of strokes, first direction and the TR of each stroke."""
    kind = str(rng.choice(KINDS, p=KIND_SHARES))
    count = _count(rng, kind)
    first = "up" if rng.random() < 0.4 and kind != "wetting" else "down"
    scatter = float(rng.choice([0.005, 0.01, 0.02]))
    down_level, up_level = rng.uniform(0.9, 1.03, 2)
    if kind in ("fading", "drop"):
        up_level = down_level * rng.uniform(0.98, 1.02)
    if kind == "X":
        up_level = 0.0
    elif kind == "Z":
        down_level = 0.0
    elif kind == "XY":
        weak = float(rng.uniform(0.3, 0.7))
        down_level, up_level = (down_level, weak) if rng.random() < 0.6 else (weak, up_level)
    down = np.array([(i % 2 == 0) == (first == "down") for i in range(count)])
    ratios = np.where(down, down_level, up_level) + scatter * rng.standard_normal(count)
    drop_after, one_sided = None, False
    if kind == "fading":
        ratios *= np.linspace(1.0, float(rng.uniform(0.5, 0.8)), count)
    elif kind == "drop":
        drop_after = count // 2 + int(rng.integers(-1, 2))
        # settled by what was drawn already, so that all other builds stay as they were
        one_sided = count % 3 == 0
        step = 2 if one_sided else 1
        ratios[drop_after::step] *= DROP
    elif kind == "peel":
        ratios[int(rng.integers(3, count))] = float(rng.uniform(-0.9, -0.3))
    elif kind == "wetting":  # first is "down": a wetting substrate takes its first layer going up
        ratios[0] = 0.005 * float(rng.standard_normal())
    type_ = kind if kind in ("X", "Z", "XY") else "Y"
    steady = kind == "Y"
    return Build(kind, type_, first, ratios, drop_after, steady, one_sided)


def decidable_type(build: Build, judgeable: list[bool], true: list[float]) -> str | None:
    """Type the judgeable strokes can tell, or None; `true` are the TRs as they came out.

    A first stroke that takes nothing says nothing (the substrate may be wetting), a type needs a stroke in
    each direction besides it, and where up and down differ by 13 to 25 % Y and XY are a matter of taste.
    So are they where one direction falls on the way.
    """
    if build.one_sided:
        return None
    seen: dict[str, list[float]] = {"down": [], "up": []}
    for index, usable in enumerate(judgeable):
        if usable and not (index == 0 and abs(build.ratios[0]) < 0.1):
            seen[build.direction(index)].append(true[index])
    if not (seen["down"] and seen["up"]):
        return None
    low, high = sorted(float(np.median(values)) for values in seen.values())
    return None if build.type in ("Y", "XY") and 0.75 < low / high < 0.87 else build.type
