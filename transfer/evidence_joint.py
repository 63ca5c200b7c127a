"""Do all kinds agree with the ledger and with each other, and what do they say together?"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity

__all__ = ["Joint", "Member", "combine", "judge", "pair_probability"]

FloatArray = NDArray[np.float64]

# Δχ² within which a second candidate cannot be told from the first (95 %, one degree of freedom).
_CLOSE = 3.84
# Relative standard uncertainty that sets an input free: far above any real one, small enough for the
# matrices to stay well conditioned.
_FREED = 30.0
# 20 000 draws give a probability of 0.0125 with a relative standard uncertainty of 6 %.
_DRAWS = 20_000
_SEED = 20_414


@dataclass(frozen=True)
class Member:
    """One measurement of the number of layers (or, with `counts` 0, of an input).

    Parameters
    ----------
    name : str
    value : float
        Layers implied; for counts = 0 the relative deviation of an input, expected 0.
    counts : float
        1 when the value measures layers, 0 when it measures an input.
    u_own : float
        Standard uncertainty that no other member shares, in the unit of `value`.
    ledger_row : (n,) array
        Relative change per change of each stroke's transfer ratio.
    powers : dict of input name -> float
        Relative change per relative change of a shared input.
    """

    name: str
    value: float
    counts: float
    u_own: float
    ledger_row: FloatArray
    powers: Mapping[str, float]


@dataclass(frozen=True)
class Joint:
    """The joint statement.

    chi_square, dof, p_value : of all members together. pull_p : probability that the member farthest
    from the rest lies as far by chance. agree : neither is below half the level asked.
    disagrees : members named, worst first. undecided : names of which one disagrees, but the data do
    not tell which. estimate : layers, best linear unbiased estimate of the members that agree.
    """

    chi_square: float
    dof: int
    p_value: float | None
    pull_p: float | None
    agree: bool
    disagrees: tuple[str, ...]
    undecided: tuple[str, ...]
    estimate: Quantity | None
    members: tuple[str, ...]


@dataclass(frozen=True)
class _Solved:
    value: float
    u: float
    chi_square: float
    dof: int
    pull_p: float


def _covariance(
    members: Sequence[Member],
    inputs: Mapping[str, Quantity],
    ledger_covariance: FloatArray,
    around: float,
    extra: Mapping[str, float],
    freed: str = "",
) -> FloatArray:
    """Covariance of the members' values over `around` (of counts-0 members: of the deviation).

    Shared relative errors act on the common number of layers, not on each measured one: with the
    measured ones the estimate would fall below all of them (Peelle's puzzle).
    """
    rows = np.array([m.ledger_row for m in members])
    own = np.array([m.u_own / (around if m.counts else 1.0) for m in members])
    out: FloatArray = np.diag(own**2) + rows @ ledger_covariance @ rows.T
    for name, quantity in inputs.items():
        relative = (quantity.u or 0.0) / abs(quantity.value)
        if name == freed:
            relative = _FREED
        lever = np.array(
            [m.powers.get(name, 0.0) + m.counts * extra.get(name, 0.0) for m in members]
        )
        if relative > 0 and np.any(lever):
            out = out + relative**2 * np.outer(lever, lever)
    return out


def _solve(
    members: Sequence[Member],
    inputs: Mapping[str, Quantity],
    ledger_covariance: FloatArray,
    start: float,
    extra: Mapping[str, float] | None = None,
    freed: str = "",
    pull: bool = False,
) -> _Solved | None:
    counts = np.array([m.counts for m in members])
    if not np.any(counts):
        return None
    around = start
    for _ in range(3):
        covariance = _covariance(members, inputs, ledger_covariance, around, extra or {}, freed)
        size = np.sqrt(np.diag(covariance))
        weight = np.linalg.pinv(covariance / np.outer(size, size), hermitian=True)
        weight = weight / np.outer(size, size)
        y = np.array([m.value / (around if m.counts else 1.0) for m in members])
        information = float(counts @ weight @ counts)
        common = float(counts @ weight @ y) / information
        rest = y - common * counts
        solved = _Solved(
            common * around,
            around / math.sqrt(information),
            float(rest @ weight @ rest),
            len(members) - 1 - (1 if freed else 0),
            1.0,
        )
        if not solved.value > 0.2 * start:
            break
        around = solved.value
    if pull and solved.dof > 0:
        return replace(solved, pull_p=_pull_probability(rest, counts, weight, information))
    return solved


def _pull_probability(
    rest: FloatArray, counts: FloatArray, weight: FloatArray, information: float
) -> float:
    """Probability of a largest fall of χ² (on leaving out one member) as large as this, by chance.

    The falls are correlated through shared inputs, so their largest is drawn for these very members.
    """
    inner = weight - np.outer(weight @ counts, counts @ weight) / information
    size = np.sqrt(np.maximum(np.diag(inner), 0.0))
    usable = size > 1e-6 * np.sqrt(np.diag(weight))
    if not np.any(usable):
        return 1.0
    values, vectors = np.linalg.eigh(inner)
    root = vectors * np.sqrt(np.maximum(values, 0.0))
    noise = np.random.default_rng(_SEED).standard_normal((_DRAWS, len(rest))) @ root.T
    drawn = np.max(np.abs(noise[:, usable]) / size[usable], axis=1)
    found = float(np.max(np.abs(inner @ rest)[usable] / size[usable]))
    return float((1 + np.count_nonzero(drawn >= found)) / (1 + _DRAWS))


def combine(
    members: Sequence[Member],
    inputs: Mapping[str, Quantity],
    ledger_covariance: FloatArray,
    start: float,
    extra: Mapping[str, float] | None = None,
) -> Quantity | None:
    """Best linear unbiased estimate of the common number of layers; None without any that counts.

    `extra` adds powers of inputs to every member that counts: the estimate then has the uncertainty of
    layers × Π input^power, as the coverage (layers over area per molecule) needs.

    Source: Aitken, Proc. R. Soc. Edinb. 1936, 55, 42 (generalised least squares).
    """
    solved = _solve(members, inputs, ledger_covariance, start, extra)
    return None if solved is None else Quantity(solved.value, solved.u, "1")


def pair_probability(
    one: Member,
    other: Member,
    inputs: Mapping[str, Quantity],
    ledger_covariance: FloatArray,
    around: float,
) -> float:
    """Probability that two members that count differ as much as they do by chance."""
    covariance = _covariance((one, other), inputs, ledger_covariance, around, {})
    variance = covariance[0, 0] + covariance[1, 1] - 2.0 * covariance[0, 1]
    z = (one.value - other.value) / around / math.sqrt(max(variance, 1e-300))
    return math.erfc(abs(z) / math.sqrt(2.0))


def judge(
    members: Sequence[Member],
    inputs: Mapping[str, Quantity],
    ledger_covariance: FloatArray,
    start: float,
    *,
    level: float,
) -> Joint:
    """Test all members together; while they disagree, take out the one that helps most.

    Parameters
    ----------
    members : sequence of Member
    inputs : dict of shared input -> Quantity
    ledger_covariance : (n, n) array, layers^2
    start : float
        Layers, a first guess (the ledger's).
    level : float
        Probability below which chance is not believed; halved between χ² and the largest pull.

    A shared input (the run sheet's layer thickness, say) is a suspect as well as any measurement when
    several members lean on it: it is named when freeing it helps clearly more than leaving out any one.
    """

    def solve(chosen: Sequence[Member], freed: str = "", *, pull: bool = False) -> _Solved | None:
        return _solve(chosen, inputs, ledger_covariance, start, None, freed, pull)

    first = solve(members, pull=True)
    if first is None:
        return Joint(0.0, 0, None, None, True, (), (), None, tuple(m.name for m in members))
    p_first = _probability(first)
    left = list(members)
    named: list[str] = []
    undecided: tuple[str, ...] = ()
    now: _Solved | None = first
    while now is not None and not _acceptable(now, level):
        gains = {
            m.name: now.chi_square - _chi(solve([k for k in left if k is not m])) for m in left
        }
        order = sorted(gains, key=lambda name: -gains[name])
        best = order[0]
        close = tuple(name for name in order if gains[best] - gains[name] < _CLOSE)
        freed = _suspect_input(left, inputs, solve, now, gains[best])
        if freed:
            named.append(freed)
            now = solve(left, freed)
            break
        if len(left) == 2 or (len(close) > 1 and gains[best] - gains[close[1]] < 1e-6):
            undecided = close if len(close) > 1 else tuple(order)
            now = None
            break
        if not named:
            undecided = close if len(close) > 1 else ()
        named.append(best)
        left = [m for m in left if m.name != best]
        now = solve(left, pull=True)
    final = None if now is None else Quantity(now.value, now.u, "1")
    return Joint(
        chi_square=first.chi_square,
        dof=first.dof,
        p_value=p_first,
        pull_p=first.pull_p if first.dof > 0 else None,
        agree=_acceptable(first, level),
        disagrees=tuple(named),
        undecided=undecided,
        estimate=final,
        members=tuple(m.name for m in members),
    )


def _chi(solved: _Solved | None) -> float:
    return math.inf if solved is None else solved.chi_square


def _acceptable(solved: _Solved, level: float) -> bool:
    """Two looks, each with half the level: all members together, and the one farthest out."""
    p_value = _probability(solved)
    return p_value is None or (p_value >= level / 2.0 and solved.pull_p >= level / 2.0)


def _probability(solved: _Solved) -> float | None:
    if solved.dof < 1:
        return None
    from scipy.special import gammaincc

    return float(gammaincc(solved.dof / 2.0, solved.chi_square / 2.0))


def _suspect_input(
    left: Sequence[Member],
    inputs: Mapping[str, Quantity],
    solve: object,
    now: _Solved,
    best_gain: float,
) -> str:
    """Input whose freedom helps clearly more than leaving out any member; "" when none does."""
    found, gain = "", best_gain + _CLOSE
    for name in inputs:
        if sum(1 for m in left if m.powers.get(name)) < 2:
            continue
        solved = solve(left, name)  # type: ignore[operator]
        if solved is not None and now.chi_square - solved.chi_square > gain:
            found, gain = name, now.chi_square - solved.chi_square
    return found
