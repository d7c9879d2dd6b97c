"""The formula behind most equations: integer powers of T and one logarithm, coefficients folded once.

A published equation brings scales, units and a reduced temperature. They are multiplied into the coefficients when
the equation is made, so an evaluation is Horner's scheme in T and nothing else.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from propdb.cp._blocks import CP, FloatArray, H, Kind, S, Scratch
from propdb.errors import EquationError

__all__ = ["FoldedKernel", "Terms"]

_MAX_EXPONENT = 32


class Terms:
    """sum(c_n T^n) + log_coefficient ln(T), evaluated as (Horner in T) / T^k + log_coefficient ln(T)."""

    __slots__ = ("_steps", "coefficients", "log_coefficient", "powers", "shift")

    def __init__(self, powers: Mapping[int, float], log_coefficient: float = 0.0) -> None:
        self.powers = {n: c for n, c in sorted(powers.items()) if c != 0.0}
        self.log_coefficient = log_coefficient
        if self.powers and (min(self.powers) < -_MAX_EXPONENT or max(self.powers) > _MAX_EXPONENT):
            raise EquationError(f"exponents must lie between {-_MAX_EXPONENT} and {_MAX_EXPONENT}")
        # Multiplied through by T^shift, so that one division serves all negative powers.
        self.shift = max(0, -min(self.powers, default=0))
        top = max(self.powers, default=0)
        self.coefficients = tuple(self.powers.get(n, 0.0) for n in range(top, -self.shift - 1, -1))
        self._steps = self._plan()

    def _plan(self) -> tuple[tuple[np.ufunc, float | None], ...]:
        """Array operations in order; an operand of None stands for T."""
        first, *rest = self.coefficients
        steps: list[tuple[np.ufunc, float | None]] = []
        for number, c in enumerate(rest):
            steps.append((np.multiply, None if number else first))
            if c != 0.0:
                steps.append((np.add, c))
        return tuple(steps)

    def value(self, t: float) -> float:
        """One value at `t` [K], by the same operations in the same order as `fill`."""
        total = self.coefficients[0]
        for c in self.coefficients[1:]:
            total = total * t + c
        if self.shift:
            power = t
            for _ in range(self.shift - 1):
                power *= t
            total /= power
        if self.log_coefficient:
            # numpy's logarithm, not math.log: the two may differ in the last place, and by more after cancellation.
            total += float(np.log(t)) * self.log_coefficient
        return total

    def fill(self, x: FloatArray, out: FloatArray, scratch: Scratch) -> None:
        """Values at `x` [K], shape (n,), written to `out`."""
        work = scratch.a(x.size)
        source = x
        final = not self.shift and not self.log_coefficient
        last = len(self._steps) - 1
        if last < 0:
            source = out if final else work
            source.fill(self.coefficients[0])
        for number, (operation, operand) in enumerate(self._steps):
            target = out if final and number == last else work
            operation(source, x if operand is None else operand, target)
            source = target
        if self.shift:
            power = x
            for _ in range(self.shift - 1):
                power = np.multiply(power, x, scratch.b(x.size))
            target = work if self.log_coefficient else out
            np.divide(source, power, target)
        if self.log_coefficient:
            logs = np.log(x, scratch.b(x.size))
            np.multiply(logs, self.log_coefficient, logs)
            np.add(work, logs, out)

    def plus(self, constant: float) -> Terms:
        """The same terms with a constant added."""
        return Terms({**self.powers, 0: self.powers.get(0, 0.0) + constant}, self.log_coefficient)


class FoldedKernel:
    """Heat capacity sum(c_n T^n) [J/mol/K] with its integrals; see `Kernel` for the methods."""

    __slots__ = ("_terms",)

    def __init__(self, cp: Terms, h: Terms, s: Terms) -> None:
        self._terms = (cp, h, s)

    @classmethod
    def from_powers(cls, powers: Mapping[int, float], *, h0: float = 0.0, s0: float = 0.0) -> FoldedKernel:
        """Integrate term by term.

        Parameters
        ----------
        powers : mapping of int to float
            Exponent to coefficient of cp, all folded [J/mol/K with T in K].
        h0 : float
            Constant of h [J/mol].
        s0 : float
            Constant of s [J/mol/K].

        Raises
        ------
        EquationError
            If a coefficient is not finite or an exponent too large.
        """
        for n, c in powers.items():
            if not math.isfinite(c):
                raise EquationError(f"the coefficient of T^{n} must be a finite number, not {c!r}")
        h = {n + 1: c / (n + 1) for n, c in powers.items() if n != -1}
        s = {n: c / n for n, c in powers.items() if n != 0}
        h[0] = h.get(0, 0.0) + h0
        s[0] = s.get(0, 0.0) + s0
        return cls(Terms(powers), Terms(h, powers.get(-1, 0.0)), Terms(s, powers.get(0, 0.0)))

    def value(self, kind: Kind, t: float) -> float:
        return self._terms[kind].value(t)

    def fill(self, kind: Kind, x: FloatArray, out: FloatArray, scratch: Scratch) -> None:
        self._terms[kind].fill(x, out, scratch)

    def divides(self, kind: Kind) -> bool:
        return self._terms[kind].shift > 0

    def shifted(self, dh: float, ds: float) -> FoldedKernel:
        cp, h, s = (self._terms[kind] for kind in (CP, H, S))
        return FoldedKernel(cp, h.plus(dh), s.plus(ds))

    def __reduce__(self) -> tuple[Any, ...]:
        return (_rebuild, tuple((terms.powers, terms.log_coefficient) for terms in self._terms))


def _rebuild(*terms: tuple[dict[int, float], float]) -> FoldedKernel:
    cp, h, s = (Terms(powers, log_coefficient) for powers, log_coefficient in terms)
    return FoldedKernel(cp, h, s)
