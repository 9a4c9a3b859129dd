"""Where the labels of a map go so that they stay clear of marks and of each other."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Final, Literal

__all__ = ["Box", "Label", "LabelPlacer"]

_LETTER: Final = 0.6  # mean width of a letter in font sizes
_LINE: Final = 1.2  # height of a line in font sizes


@dataclass(frozen=True)
class Box:
    """A rectangle in points: left, bottom, right, top."""

    left: float
    bottom: float
    right: float
    top: float

    def shared(self, other: Box) -> float:
        """Return the area that two rectangles share.

        Examples
        --------
        >>> Box(0, 0, 2, 2).shared(Box(1, 1, 3, 3)), Box(0, 0, 1, 1).shared(Box(2, 2, 3, 3))
        (1, 0)
        """
        wide = min(self.right, other.right) - max(self.left, other.left)
        high = min(self.top, other.top) - max(self.bottom, other.bottom)
        return wide * high if wide > 0 and high > 0 else 0

    @property
    def area(self) -> float:
        """Width times height."""
        return (self.right - self.left) * (self.top - self.bottom)


@dataclass(frozen=True)
class Label:
    """A label's place: an anchor in points and how the text lies to it."""

    x: float
    y: float
    side: Literal["left", "center", "right"]
    box: Box


@dataclass
class LabelPlacer:
    """Places labels one after the other, each where it covers the least of what is there already.

    Parameters
    ----------
    frame
        The map, in points; no label leaves it.
    taken
        What must stay clear from the start, such as the gauges' marks.
    """

    frame: Box
    taken: list[Box] = field(default_factory=list)

    def beside(self, x: float, y: float, lines: Sequence[str], size: float, *, gap: float) -> Label | None:
        """Return a place beside a mark, or None where every place would hide something.

        Parameters
        ----------
        x, y
            The mark's centre in points.
        lines
            The label's lines.
        size
            Font size in points.
        gap
            Distance kept from the mark's centre.
        """
        wide, high = self._size(lines, size)
        d = gap * 0.75
        places: list[tuple[float, float, Literal["left", "center", "right"]]] = [
            (x + gap, y, "left"),
            (x - gap, y, "right"),
            (x, y + gap + high / 2, "center"),
            (x, y - gap - high / 2, "center"),
            (x + d, y + d + high / 2, "left"),
            (x + d, y - d - high / 2, "left"),
            (x - d, y + d + high / 2, "right"),
            (x - d, y - d - high / 2, "right"),
        ]
        return self._best([self._label(px, py, side, wide, high) for px, py, side in places])

    def over(self, places: Sequence[tuple[float, float]], text: str, size: float) -> Label | None:
        """Return a place for a text centred on one of several points, or None."""
        wide, high = self._size([text], size)
        return self._best([self._label(x, y, "center", wide, high) for x, y in places])

    @staticmethod
    def _size(lines: Sequence[str], size: float) -> tuple[float, float]:
        return max(len(line) for line in lines) * _LETTER * size, len(lines) * _LINE * size

    @staticmethod
    def _label(x: float, y: float, side: Literal["left", "center", "right"], wide: float, high: float) -> Label:
        left = {"left": x, "center": x - wide / 2, "right": x - wide}[side]
        return Label(x, y, side, Box(left, y - high / 2, left + wide, y + high / 2))

    def _best(self, labels: Sequence[Label]) -> Label | None:
        costs = []
        for label in labels:
            outside = label.box.area - label.box.shared(self.frame)
            costs.append(outside * 10 + sum(label.box.shared(box) for box in self.taken))
        least = min(range(len(labels)), key=costs.__getitem__)
        if costs[least] > 0.12 * labels[least].box.area:
            return None
        self.taken.append(labels[least].box)
        return labels[least]
