"""Plane geometry of drawings: points and boxes in px, y downwards."""

import math
from collections.abc import Iterable, Sequence
from itertools import pairwise
from typing import NamedTuple

__all__ = ["Box", "Point", "convex_hull", "exit_distance", "is_inside", "svg_number", "svg_point", "toward"]

Point = tuple[float, float]


class Box(NamedTuple):
    """A rectangle."""

    left: float
    top: float
    right: float
    bottom: float

    @property
    def width(self) -> float:
        """Return the width."""
        return self.right - self.left

    @property
    def height(self) -> float:
        """Return the height."""
        return self.bottom - self.top

    @property
    def middle(self) -> Point:
        """Return the middle."""
        return (self.left + self.right) / 2, (self.top + self.bottom) / 2

    def moved(self, dx: float, dy: float) -> "Box":
        """Return the box elsewhere."""
        return Box(self.left + dx, self.top + dy, self.right + dx, self.bottom + dy)

    def scaled(self, by: float) -> "Box":
        """Return the box scaled about the origin."""
        return Box(self.left * by, self.top * by, self.right * by, self.bottom * by)

    def grown(self, by: float) -> "Box":
        """Return the box with a border on every side."""
        return Box(self.left - by, self.top - by, self.right + by, self.bottom + by)

    def overlaps(self, other: "Box") -> bool:
        """Answer whether the two share area; touching edges do not count."""
        beside = self.right <= other.left or other.right <= self.left
        return not (beside or self.bottom <= other.top or other.bottom <= self.top)

    @staticmethod
    def around(boxes: Iterable["Box"]) -> "Box":
        """Return the smallest box that holds all; at least one is needed."""
        lefts, tops, rights, bottoms = zip(*boxes, strict=True)
        return Box(min(lefts), min(tops), max(rights), max(bottoms))


def toward(start: Point, end: Point) -> tuple[float, float, float]:
    """Return the unit vector from start to end, and the distance; (0, 0, 1) if they coincide."""
    dx, dy = end[0] - start[0], end[1] - start[1]
    length = math.hypot(dx, dy) or 1.0
    return dx / length, dy / length, length


def exit_distance(box: Box, start: Point, direction: Point) -> float:
    """Return how far a ray from `start` runs until it has left the box for good; 0 if it never meets it."""
    near, far = 0.0, math.inf
    for at, step, low, high in (
        (start[0], direction[0], box.left, box.right),
        (start[1], direction[1], box.top, box.bottom),
    ):
        if abs(step) < 1e-9:
            if not low <= at <= high:
                return 0.0
            continue
        first, last = (low - at) / step, (high - at) / step
        if first > last:
            first, last = last, first
        near, far = max(near, first), min(far, last)
    return far if far > near else 0.0


def convex_hull(points: Iterable[Point]) -> list[Point]:
    """Return the corners of the convex hull in order (Andrew's monotone chain)."""
    ordered = sorted(set(points))
    corners: list[Point] = []
    for sequence in (ordered, ordered[::-1]):
        chain: list[Point] = []
        for point in sequence:
            while len(chain) > 1 and _cross(chain[-2], chain[-1], point) <= 1e-9:
                chain.pop()
            chain.append(point)
        corners += chain[:-1]
    return corners


def is_inside(point: Point, hull: Sequence[Point]) -> bool:
    """Answer whether a point lies in a hull made by `convex_hull`, edges included."""
    return all(_cross(a, b, point) > -1e-6 for a, b in pairwise([*hull, hull[0]]))


def _cross(origin: Point, a: Point, b: Point) -> float:
    return (a[0] - origin[0]) * (b[1] - origin[1]) - (a[1] - origin[1]) * (b[0] - origin[0])


def svg_number(value: float) -> str:
    """Return a length to one decimal, in the shortest form."""
    text = f"{value:.1f}"
    return "0" if text == "-0.0" else text.removesuffix(".0")


def svg_point(point: Point) -> str:
    """Return a point as path data."""
    return f"{svg_number(point[0])} {svg_number(point[1])}"
