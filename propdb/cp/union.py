"""One heat capacity made of several equations, each on its own range."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

from propdb.cp._base import Equation, PiecewiseEquation, set_field
from propdb.cp._blocks import H, Kernel, S
from propdb.cp._params import check_touching, only, rows
from propdb.cp.table import Table
from propdb.errors import EquationError, SplitError

__all__ = ["Union"]


@dataclass(frozen=True, slots=True)
class Union(PiecewiseEquation):
    """Equations that follow each other in temperature; a joint belongs to the piece below it.

    Pieces whose constants are arbitrary are shifted until h and s are continuous. NASA records and Shomate equations
    with F, G, H carry constants of their own: these are kept, and what remains at a joint is reported by `jumps`.

    Parameters
    ----------
    pieces : sequence of Equation
        Going up in temperature, without gap or overlap.
    continuous : bool, optional
        True shifts every piece, also those with constants of their own, to the lowest that has them, or the lowest;
        False shifts none. Not given: as described above.

    Raises
    ------
    EquationError
        If there are fewer than two pieces, or they leave a gap or overlap.
    SplitError
        If a table among them has a split whose enthalpy is not stated.
    """

    pieces: tuple[Equation, ...]
    continuous: bool | None = None
    tmin: float = field(init=False, compare=False)
    tmax: float = field(init=False, compare=False)
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "union"

    def __post_init__(self) -> None:
        pieces = tuple(self.pieces)
        if len(pieces) < 2:
            raise EquationError("a union needs at least two pieces")
        between = check_touching([(piece.tmin, piece.tmax) for piece in pieces])
        for piece in pieces:
            if isinstance(piece, Table) and piece.unstated:
                raise SplitError(
                    f"the table is split at {piece.unstated[0]:g} K and the enthalpy of the transition is not stated",
                    hint="state it (0 if there is none) before joining it to other pieces",
                    T=piece.unstated[0],
                )
        groups = [piece.kernels for piece in pieces]
        if self.continuous is not False:
            groups = _joined(pieces, between, keep_own=self.continuous is None)
        joints: list[float] = []
        for piece, joint in zip(pieces, (*between, None), strict=True):
            joints += piece.joints if joint is None else (*piece.joints, joint)
        set_field(
            self,
            pieces=pieces,
            tmin=pieces[0].tmin,
            tmax=pieces[-1].tmax,
            kernels=tuple(kernel for group in groups for kernel in group),
            joints=tuple(joints),
        )

    @property
    def absolute(self) -> bool:
        """Whether h and s carry constants of a record, rather than an arbitrary zero."""
        shifted_to_own = self.continuous is not False and any(piece.absolute for piece in self.pieces)
        return shifted_to_own or all(piece.absolute for piece in self.pieces)

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"pieces": [{"equation": name, ...}, ...]}`, `"continuous"` if it is given."""
        from propdb.cp.registry import build_heat_capacity  # the registry lists this class

        only(params, ("pieces",), ("continuous",))
        pieces = []
        for row in rows(params["pieces"], "pieces"):
            if "equation" not in row:
                raise EquationError("'equation' is missing from a piece", hint="it names the equation of the piece")
            own = {key: value for key, value in row.items() if key != "equation"}
            pieces.append(build_heat_capacity(row["equation"], own))
        continuous = params.get("continuous")
        if continuous not in (True, False, None):
            raise EquationError(f"continuous must be true, false or absent, not {continuous!r}")
        return cls(tuple(pieces), continuous)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"pieces": [{"equation": piece.name, **piece.params()} for piece in self.pieces]}
        if self.continuous is not None:
            stored["continuous"] = self.continuous
        return stored


def _joined(pieces: Sequence[Equation], between: Sequence[float], *, keep_own: bool) -> list[tuple[Kernel, ...]]:
    """Kernels of each piece, shifted outwards from the lowest piece with constants of its own."""
    groups = [piece.kernels for piece in pieces]
    anchor = next((number for number, piece in enumerate(pieces) if piece.absolute), 0)
    for number in range(anchor + 1, len(pieces)):
        if not (keep_own and pieces[number].absolute):
            groups[number] = _meet(groups[number], 0, groups[number - 1][-1], between[number - 1])
    for number in range(anchor - 1, -1, -1):
        groups[number] = _meet(groups[number], -1, groups[number + 1][0], between[number])
    return groups


def _meet(group: tuple[Kernel, ...], end: int, neighbour: Kernel, joint: float) -> tuple[Kernel, ...]:
    dh, ds = (neighbour.value(kind, joint) - group[end].value(kind, joint) for kind in (H, S))
    return tuple(kernel.shifted(dh, ds) for kernel in group)
