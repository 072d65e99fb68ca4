"""The bisection of a box of angles, in preorder, and trigonometric sums on a box (cone.md)."""

from answer import Malformed, ensure
from flint import acb, arb, fmpq

import limits

TURN = fmpq(44, 7)


def leaves(nodes, dimension):
    """Each leaf with the centre and the half widths of its box."""
    open_boxes = [([TURN / 2] * dimension, [TURN / 2] * dimension, 0)]
    for node in nodes:
        ensure(open_boxes, "LeavesCoverTorus", "a node too many")
        centre, half, depth = open_boxes.pop()
        if not isinstance(node, int):
            yield node, centre, half
            continue
        if node >= dimension:
            raise Malformed("an axis of the torus", str(node))
        limits.at_most(depth + 1, limits.DEPTH, "depth")
        half = [h / 2 if i == node else h for i, h in enumerate(half)]
        for direction in (1, -1):
            moved = [c + direction * half[i] if i == node else c for i, c in enumerate(centre)]
            open_boxes.append((moved, half, depth + 1))
    ensure(not open_boxes, "LeavesCoverTorus", "a box without a leaf")


def waves_on(waves, centre, half):
    """An enclosure of the sum of Re(c exp(i n . phi)) over (c, n), on a box."""
    value = arb(0)
    slopes = [arb(0)] * len(centre)
    bend = arb(0)
    for c, turns in waves:
        angle = sum((n * x for n, x in zip(turns, centre)), fmpq(0))
        rotated = c * acb(0, arb(angle)).exp()
        value += rotated.real
        for j, n in enumerate(turns):
            slopes[j] -= n * rotated.imag
        width = sum((abs(n) * h for n, h in zip(turns, half)), fmpq(0))
        bend += abs(c) * arb(width) ** 2 / 2
    radius = bend + sum((abs(s) * arb(h) for s, h in zip(slopes, half)), arb(0))
    return value + arb(0, radius.upper())
