"""Labels of figures as plain text: what mathtext sets in the drawing, written with Unicode signs."""

from __future__ import annotations

import re

__all__ = ["plain_label"]

SIGNS = {
    "Pi": "Π", "pi": "π", "omega": "ω", "Delta": "Δ", "gamma": "γ", "mu": "μ", "varepsilon": "ε",
    "perp": "⊥", "Sigma": "Σ", "ln": "ln", "sqrt": "√", "phi": "φ", "chi": "χ", "Gamma": "Γ",
    "times": "×", "pm": "±",
}  # fmt: skip
RAISED = str.maketrans("0123456789-+", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺")
LOWERED = str.maketrans("0123456789-+", "₀₁₂₃₄₅₆₇₈₉₋₊")


def plain_label(label: str) -> str:
    r"""Write a label without markup.

    >>> plain_label(r"surface pressure $\Pi$ / mN m$^{-1}$")
    'surface pressure Π / mN m⁻¹'
    >>> plain_label(r"$\Pi-\Pi_0$ of $A_\mathrm{ex}$")
    'Π-Π₀ of A_ex'
    >>> plain_label(r"a run of 5 \$")
    'a run of 5 $'
    """
    parts = re.split(r"(?<!\\)\$", label)
    if len(parts) % 2 == 0:  # a lone dollar sign is one
        return " ".join(label.replace(r"\$", "$").split())
    written = [part if n % 2 == 0 else _math(part) for n, part in enumerate(parts)]
    return " ".join("".join(written).replace(r"\$", "$").split())


def _math(text: str) -> str:
    text = re.sub(r"\\math\w+\s*\{([^{}]*)\}", r"\1", text)
    text = re.sub(r"\\([A-Za-z]+)", lambda m: SIGNS.get(m[1], m[1]), text)
    text = re.sub(r"\\[,;: ]", " ", text)
    text = re.sub(r"\^(?:\{([-+\d]+)\}|(\d))", lambda m: (m[1] or m[2]).translate(RAISED), text)
    text = re.sub(r"_(?:\{([-+\d]+)\}|(\d))", lambda m: (m[1] or m[2]).translate(LOWERED), text)
    return text.replace("{", "").replace("}", "")
