"""Where the names of series stand: beside their ends, apart from each other."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QFontMetricsF

from desk.window.parts.theme import HALF

__all__ = ["Name", "boxes_of", "packed"]

SIDE = 6.0
"""Between the end of a line and its name [px]."""


@dataclass(frozen=True)
class Name:
    """A name in a picture.

    Attributes
    ----------
    text, role : str
    x, y : float
        The end that it stands beside, as values.
    at_top : bool
        It belongs to a line from top to bottom, and stands at its top.
    """

    text: str
    role: str
    x: float
    y: float
    at_top: bool = False


def boxes_of(
    names: Sequence[Name], ends: Sequence[QPointF], area: QRectF, metrics: QFontMetricsF
) -> list[QRectF]:
    """The boxes of `names` about their `ends` in `area` [px], moved apart where they would overlap."""
    boxes: list[QRectF] = []
    for name, end in zip(names, ends, strict=True):
        width, height = metrics.horizontalAdvance(name.text), metrics.height()
        if name.at_top:
            start = end.x() + HALF
            if start + width > area.right():
                start = end.x() - HALF - width
            boxes.append(QRectF(start, area.top(), width, height))
        else:
            boxes.append(QRectF(end.x() + SIDE, end.y() - height / 2, width, height))
    for group in _columns(boxes):
        centres = packed(
            [boxes[place].center().y() for place in group],
            [boxes[place].height() for place in group],
            area.top(),
            area.bottom(),
        )
        for place, centre in zip(group, centres, strict=True):
            boxes[place].moveTop(centre - boxes[place].height() / 2)
    return boxes


def _columns(boxes: Sequence[QRectF]) -> list[list[int]]:
    """Places of boxes in groups within which they may stand above one another."""
    groups: list[list[int]] = []
    edge = -math.inf
    for place in sorted(range(len(boxes)), key=lambda place: boxes[place].left()):
        if not groups or boxes[place].left() >= edge:
            groups.append([])
            edge = -math.inf
        groups[-1].append(place)
        edge = max(edge, boxes[place].right())
    return groups


def packed(centres: Sequence[float], heights: Sequence[float], low: float, high: float) -> list[float]:
    """Centres moved as little as keeps pieces of these heights apart, in their order, in ``low`` to ``high``.

    Neighbours that would overlap become one cluster about the mean of where they wanted to be. Where there is
    not room for all, they start at `low` and run over.
    """
    order = sorted(range(len(centres)), key=lambda place: centres[place])
    clusters: list[tuple[list[int], float, float]] = []  # members, sum of wanted tops, height

    def top_of(cluster: tuple[list[int], float, float]) -> float:
        members, wanted, height = cluster
        return max(low, min(wanted / len(members), high - height))

    for place in order:
        cluster = ([place], centres[place] - heights[place] / 2, heights[place])
        while clusters and top_of(clusters[-1]) + clusters[-1][2] > top_of(cluster):
            members, wanted, height = clusters.pop()
            # A later member's wish for the cluster's top is its own less what stands above it.
            cluster = (
                members + cluster[0],
                wanted + cluster[1] - height * len(cluster[0]),
                height + cluster[2],
            )
        clusters.append(cluster)
    result = [0.0] * len(centres)
    for cluster in clusters:
        top = top_of(cluster)
        for place in cluster[0]:
            result[place] = top + heights[place] / 2
            top += heights[place]
    return result
