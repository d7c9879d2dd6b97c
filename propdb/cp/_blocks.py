"""What every equation shares: temperatures taken in, checked, and worked through in blocks that stay in the cache.

An equation is evaluated by *kernels*, one per temperature interval. A kernel never checks a range and never keeps
scratch memory between calls, so equations may be used from several threads at once.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Literal, NoReturn, Protocol

import numpy as np
from numpy.typing import NDArray

from propdb.errors import TemperatureError

__all__ = [
    "BLOCK",
    "CP",
    "FloatArray",
    "H",
    "Kernel",
    "Kind",
    "S",
    "Scratch",
    "Temperatures",
    "evaluate",
    "not_a_temperature",
    "piece_of",
    "refuse",
    "temperatures",
    "too_extreme",
]

FloatArray = NDArray[np.float64]
Temperatures = NDArray[Any] | Sequence[float]
Kind = Literal[0, 1, 2]

CP: Literal[0] = 0
H: Literal[1] = 1
S: Literal[2] = 2

# Temperatures per block. Block, result and scratch take 768 KiB, about a second-level cache; smaller blocks lose more
# to the cost of calls than they gain (measured from 2,048 to 65,536).
BLOCK = 32_768
_INFINITY_BITS = np.uint64(0x7FF0_0000_0000_0000)


class Kernel(Protocol):
    """The formula of one interval for cp, h and s."""

    def value(self, kind: Kind, t: float) -> float:
        """One value at `t` [K]."""

    def fill(self, kind: Kind, x: FloatArray, out: FloatArray, scratch: Scratch) -> None:
        """Values at `x` [K], shape (n,) with n <= scratch.size, written to `out`; `x` and `out` do not overlap."""

    def divides(self, kind: Kind) -> bool:
        """Whether a temperature of exactly zero shows as a division by zero."""

    def shifted(self, dh: float, ds: float) -> Kernel:
        """The same kernel with `dh` [J/mol] added to h and `ds` [J/mol/K] to s."""


def aligned(size: int, dtype: type[np.generic] = np.float64) -> NDArray[Any]:
    """An uninitialised array, shape (size,), starting on a cache line (vector loads across lines cost a fifth)."""
    itemsize = np.dtype(dtype).itemsize
    raw = np.empty(size * itemsize + 64, dtype=np.uint8)
    start = -raw.ctypes.data % 64
    return raw[start : start + size * itemsize].view(dtype)


class Scratch:
    """Working memory of one call, for blocks of up to `size` temperatures."""

    __slots__ = ("_a", "_b", "_gather", "_spare", "size")

    def __init__(self, size: int) -> None:
        self.size = size
        self._a: FloatArray = aligned(size)
        self._b: FloatArray | None = None
        self._spare: tuple[FloatArray, FloatArray] | None = None
        self._gather: tuple[NDArray[np.intp], FloatArray, NDArray[np.complex128]] | None = None

    def a(self, n: int) -> FloatArray:
        """The first working array of a kernel, shape (n,)."""
        return self._a[:n]

    def b(self, n: int) -> FloatArray:
        """The second working array of a kernel, shape (n,)."""
        if self._b is None:
            self._b = aligned(self.size)
        return self._b[:n]

    def spare(self) -> tuple[FloatArray, FloatArray]:
        """Temperatures of one interval and their results, both shape (size,); kernels leave them alone."""
        if self._spare is None:
            self._spare = aligned(self.size), aligned(self.size)
        return self._spare

    def gather(self, n: int) -> tuple[NDArray[np.intp], FloatArray, NDArray[np.complex128]]:
        """Row numbers, single and paired coefficients of a table, each shape (n,)."""
        if self._gather is None:
            self._gather = aligned(self.size, np.intp), aligned(self.size), aligned(self.size, np.complex128)
        rows, single, paired = self._gather
        return rows[:n], single[:n], paired[:n]


def temperatures(T: object) -> FloatArray:
    """`T` as float64 of the same shape; the values are not yet checked.

    Raises
    ------
    TemperatureError
        If `T` does not hold real numbers.
    """
    try:
        given = np.asarray(T)
    except ValueError as error:
        raise TemperatureError("temperatures must form a regular array of numbers in K") from error
    if given.dtype.kind not in "iuf":
        raise TemperatureError(f"temperatures must be real numbers in K, not {given.dtype}")
    return given.astype(np.float64, copy=False)


def evaluate(
    kernels: tuple[Kernel, ...], joints: tuple[float, ...], kind: Kind, T: object, out: FloatArray | None
) -> FloatArray:
    """Evaluate a piecewise formula at an array of temperatures.

    Parameters
    ----------
    kernels : tuple of Kernel
        One per interval, in order of temperature.
    joints : tuple of float
        Temperatures between them [K], one fewer; a joint belongs to the interval below it.
    kind : Kind
        `CP`, `H` or `S`.
    T : array_like of float
        Temperatures [K], any shape.
    out : ndarray of float64, optional
        Where the result goes, same shape; its contents are undefined if an error is raised.

    Raises
    ------
    TemperatureError
        If a temperature is not a finite number above 0 K, or too extreme for float64.
    """
    given = temperatures(T)
    if out is None:
        out = np.empty(given.shape)
    elif not isinstance(out, np.ndarray) or out.dtype != np.float64 or out.shape != given.shape:
        raise TypeError(f"out must be a float64 array of shape {given.shape}")
    x = given.reshape(-1)
    if np.may_share_memory(x, out):
        x = x.copy()
    flat = out.reshape(-1) if out.flags.c_contiguous else np.empty(x.size)
    scratch = Scratch(min(BLOCK, max(x.size, 1)))
    try:
        with np.errstate(divide="raise", over="raise", invalid="raise", under="ignore"):
            for start in range(0, x.size, BLOCK):
                block = x[start : start + BLOCK]
                target = flat[start : start + BLOCK]
                if not joints:
                    _check_one_formula(kernels[0], kind, block)
                    kernels[0].fill(kind, block, target, scratch)
                else:
                    _fill_pieces(kernels, joints, kind, block, target, scratch)
    except FloatingPointError:
        refuse(x)
    if not out.flags.c_contiguous:
        np.copyto(out, flat.reshape(out.shape))
    return out


def _check_one_formula(kernel: Kernel, kind: Kind, block: FloatArray) -> None:
    if kernel.divides(kind):
        # Read as unsigned integers, negative numbers, infinities and NaN all lie at or above infinity; zero, the one
        # bad temperature left, raises the division flag. One pass instead of two.
        good = np.maximum.reduce(block.view(np.uint64)) < _INFINITY_BITS
    else:
        low, high = np.minimum.reduce(block), np.maximum.reduce(block)
        good = low > 0.0 and high < math.inf
    if not good:
        refuse(block)


def _fill_pieces(
    kernels: tuple[Kernel, ...],
    joints: tuple[float, ...],
    kind: Kind,
    block: FloatArray,
    target: FloatArray,
    scratch: Scratch,
) -> None:
    low, high = float(np.minimum.reduce(block)), float(np.maximum.reduce(block))
    if not (low > 0.0 and high < math.inf):
        refuse(block)
    first, last = piece_of(joints, low), piece_of(joints, high)
    if first == last:
        kernels[first].fill(kind, block, target, scratch)
        return
    some, results = scratch.spare()
    above = np.ones(block.size, dtype=bool)
    for number in range(first, last + 1):
        if number < last:
            beyond = block > joints[number]
            (where,) = (above ^ beyond).nonzero()  # beyond implies above
            above = beyond
        else:
            (where,) = above.nonzero()
        n = where.size
        np.take(block, where, out=some[:n], mode="clip")
        kernels[number].fill(kind, some[:n], results[:n], scratch)
        target[where] = results[:n]


def piece_of(joints: tuple[float, ...], t: float) -> int:
    """Number of the interval that `t` [K] belongs to."""
    number = 0
    for joint in joints:
        if t <= joint:
            break
        number += 1
    return number


def refuse(x: FloatArray) -> NoReturn:
    """Raise for the first bad temperature of `x`."""
    flat = x.reshape(-1)
    (bad,) = np.nonzero(~(np.isfinite(flat) & (flat > 0.0)))
    if bad.size == 0:
        raise too_extreme(float(flat.min()), float(flat.max()))
    raise not_a_temperature(float(flat[bad[0]]), position=int(bad[0]))


def not_a_temperature(t: float, **fields: Any) -> TemperatureError:
    """The error for one bad temperature [K]."""
    problem = f"{t!r} K is not a finite temperature above 0 K"
    return TemperatureError(problem, hint="temperatures are in K", t=t, **fields)


def too_extreme(*t: float) -> TemperatureError:
    """The error for temperatures [K] at which a formula overflows."""
    which = " to ".join(f"{x:.6g}" for x in dict.fromkeys(t))
    return TemperatureError(f"{which} K is too extreme for this equation", hint="temperatures are in K")
