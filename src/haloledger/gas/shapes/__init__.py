"""Density shapes, one a file. Adding one: write its class in a new file, name it in SHAPES, give it a model file."""

from haloledger.gas.shapes.base import AXES, Shape
from haloledger.gas.shapes.gnfw_fit import GNFWFit
from haloledger.gas.shapes.maller_bullock import MallerBullock
from haloledger.gas.shapes.modified_nfw import ModifiedNFW
from haloledger.gas.shapes.nfw import CoredNFW
from haloledger.gas.shapes.steepened_beta import SteepenedBeta
from haloledger.gas.shapes.table import DensityTable

SHAPES: dict[str, type[Shape]] = {
    s.kind: s for s in (ModifiedNFW, CoredNFW, GNFWFit, SteepenedBeta, MallerBullock, DensityTable)
}

__all__ = ["AXES", "SHAPES", "Shape"]
