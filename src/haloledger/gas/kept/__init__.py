"""Kept-fraction laws, one a file. Adding one: write the class in a new file and name it in LAWS."""

from haloledger.gas.kept.base import RADII, KeptLaw
from haloledger.gas.kept.constant import Constant
from haloledger.gas.kept.gas_fraction import GasFraction
from haloledger.gas.kept.knots import Knots
from haloledger.gas.kept.power_law import PowerLaw

LAWS: dict[str, type[KeptLaw]] = {k.law: k for k in (Constant, PowerLaw, Knots, GasFraction)}

__all__ = ["LAWS", "RADII", "KeptLaw"]
