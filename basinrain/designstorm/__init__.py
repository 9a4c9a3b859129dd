"""Design storms: depths of a duration and a probability, their areal reduction, and how they fall in time."""

from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.depth_chain import DepthChain
from basinrain.designstorm.design_storms import DesignStorm, PatternChoice, PointOfInterest
from basinrain.designstorm.equations import EQUATIONS, EquationDepths
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.patterns import PATTERNS
from basinrain.designstorm.point_depths import PointDepths

__all__ = [
    "EQUATIONS",
    "PATTERNS",
    "REDUCTIONS",
    "DepthChain",
    "DesignStorm",
    "EquationDepths",
    "Frequency",
    "PatternChoice",
    "PointDepths",
    "PointOfInterest",
]
