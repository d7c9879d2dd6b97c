"""Heat capacities and latent heats as functions of temperature: value, integral and integral over T, in closed form.

Inside: J/mol, J/mol/K, K. Start-up is light: scipy, which takes half a second, is not needed for tables.
"""

from propdb.cp._base import Equation, Jump
from propdb.cp.alylee import AlyLee
from propdb.cp.checks import JointError, h298_error, joint_errors
from propdb.cp.latent import ConstantLatent, LatentHeat, Watson
from propdb.cp.liquids import PerryLiquid, ZabranskyCubic, ZabranskyQuasi
from propdb.cp.nasa import GAS_CONSTANT, Nasa7, Nasa9, NasaInterval
from propdb.cp.polynomial import Constant, Polynomial
from propdb.cp.registry import EQUATIONS, EquationSpec, build, build_heat_capacity, build_latent_heat
from propdb.cp.shomate import Shomate, ShomateInterval
from propdb.cp.table import Table
from propdb.cp.trc import TrcGas
from propdb.cp.union import Union
from propdb.cp.vaporisation import PerryVaporisation, VdiVaporisation

__all__ = [
    "EQUATIONS",
    "GAS_CONSTANT",
    "AlyLee",
    "Constant",
    "ConstantLatent",
    "Equation",
    "EquationSpec",
    "JointError",
    "Jump",
    "LatentHeat",
    "Nasa7",
    "Nasa9",
    "NasaInterval",
    "PerryLiquid",
    "PerryVaporisation",
    "Polynomial",
    "Shomate",
    "ShomateInterval",
    "Table",
    "TrcGas",
    "Union",
    "VdiVaporisation",
    "Watson",
    "ZabranskyCubic",
    "ZabranskyQuasi",
    "build",
    "build_heat_capacity",
    "build_latent_heat",
    "h298_error",
    "joint_errors",
]
