"""Overlaps of cells with mixed edges against 50-digit arithmetic (MPFR) that shares no code with windrow.

Each cell comes as its arcs: ends, circle (n, d), angle. In 50 digits an arc is made exact first: its ends become unit
vectors and its circle's normal loses what does not stand upright on the chord, so that loops close; that moves an edge
by rounding only. The overlap's boundary is made of the parts of each cell's arcs that lie within the other cell. Their
areas against a fixed point (triangle and lens) add up to the overlap's area modulo 4 pi; nothing has to be ordered.
Whether a part lies inside is decided by counting crossings on the way to the antipode of the cell, where it is not.

Bound: 1e-12 of the row cell's area + 8 eps * perimeter.
Usage: mixed_pairs.py PATH_OF_oracle_pairs COUNT SEED
"""
import json
import math
import subprocess
import sys

import gmpy2
from gmpy2 import mpfr

gmpy2.get_context().precision = 170
ZERO, ONE, TWO = mpfr(0), mpfr(1), mpfr(2)
PI = gmpy2.const_pi()
ON = mpfr(10) ** -38  # rad: nearer than this is the same point, or on the same circle
EPS = sys.float_info.epsilon


def dot(a, b):
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def cross(a, b):
    return a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]


def add(a, b):
    return a[0] + b[0], a[1] + b[1], a[2] + b[2]


def sub(a, b):
    return a[0] - b[0], a[1] - b[1], a[2] - b[2]


def scaled(s, a):
    return s * a[0], s * a[1], s * a[2]


def unit(a):
    return scaled(1 / gmpy2.sqrt(dot(a, a)), a)


class Arc:
    """From `start` in the positive sense of the circle n.x = d through `angle`; left of it is the cell."""

    def __init__(self, start, end, n, d):
        self.start, self.end, self.n, self.d = start, end, n, d
        self.centre = scaled(d, n)
        self.e1 = sub(start, self.centre)
        self.radius2 = dot(self.e1, self.e1)
        self.e2 = cross(n, self.e1)
        self.angle = self.angle_of(end)
        # In double, to tell quickly which arcs are far apart.
        self.middle = [float(x) for x in self.at(self.angle / 2)]
        self.reach = float(gmpy2.sqrt(self.radius2) * self.angle) / 2 * 1.01 + 1e-12

    def angle_of(self, x):
        r = sub(x, self.centre)
        angle = gmpy2.atan2(dot(r, self.e2), dot(r, self.e1))
        return angle + 2 * PI if angle < 0 else angle

    def at(self, angle):
        return add(self.centre, add(scaled(gmpy2.cos(angle), self.e1), scaled(gmpy2.sin(angle), self.e2)))

    def part(self, a, b):
        return Arc(self.at(a) if a > 0 else self.start, self.at(b) if b < self.angle else self.end, self.n, self.d)

    def meets(self, x):
        """Angle of a point of the circle on this arc, None beyond its ends; ends within rounding of 50 digits count."""
        angle = self.angle_of(x)
        tolerance = ON / gmpy2.sqrt(self.radius2)
        if angle > 2 * PI - tolerance:
            return ZERO
        if angle <= self.angle:
            return angle
        return self.angle if angle <= self.angle + tolerance else None


def exact_arc(numbers):
    start, end, n, d, dtheta = numbers
    if dtheta < 0:  # against its circle: along the reversed one
        n, d = [-x for x in n], -d
    start, end = (unit([mpfr(x) for x in p]) for p in (start, end))
    n = [mpfr(x) for x in n]
    chord = sub(end, start)
    n = unit(sub(n, scaled(dot(n, chord) / dot(chord, chord), chord)))
    arc = Arc(start, end, n, ZERO if d == 0 and abs(dot(n, start)) < ON else dot(n, start))
    if abs(float(arc.angle) - abs(dtheta)) > 1e-3 + 1e-3 * abs(dtheta):
        raise ValueError(f"an arc of {dtheta} rad spans {float(arc.angle)} between its ends")
    return arc


def far(a, b):
    gap = math.dist(a.middle, b.middle)
    return gap > a.reach + b.reach


def same_circle(a, b):
    """1 for one circle, -1 for one run the other way, 0 otherwise."""
    for sign in (1, -1):
        off = sub(a.n, scaled(sign, b.n))
        if dot(off, off) < ON * ON and abs(a.d - sign * b.d) < ON:
            return sign
    return 0


def common_points(a, b):
    """Points where two different circles meet."""
    c = dot(a.n, b.n)
    w = cross(a.n, b.n)
    s2 = dot(w, w)
    if s2 == 0:
        return []
    alpha, beta = (a.d - c * b.d) / s2, (b.d - c * a.d) / s2
    x0 = add(scaled(alpha, a.n), scaled(beta, b.n))
    g2 = (1 - dot(x0, x0)) / s2
    if g2 < 0:
        return []
    g = gmpy2.sqrt(g2)
    return [add(x0, scaled(g, w)), sub(x0, scaled(g, w))]


def crossings(a, b):
    """Angles along `a` where it meets `b`, of two different circles."""
    if far(a, b):
        return []
    found = []
    for x in common_points(a, b):
        along = a.meets(x)
        if along is not None and b.meets(x) is not None:
            found.append(along)
    return found


class Piece:
    def __init__(self, arcs):
        self.arcs = [exact_arc(a) for a in arcs]
        middle = (ZERO, ZERO, ZERO)
        for arc in self.arcs:
            middle = add(middle, arc.start)
        # Off the antipode by what no cell is aligned with, so that no way there runs through a corner.
        self.outside = unit(add(scaled(-1, unit(middle)), (mpfr("1.23e-3"), mpfr("-3.7e-4"), mpfr("7.7e-4"))))

    def holds(self, p):
        n = unit(cross(p, self.outside))
        way = Arc(p, self.outside, n, ZERO)
        half_way = way.at(way.angle / 2)
        across = [float(x) for x in n]
        crossed = 0
        for arc in self.arcs:
            if abs(across[0] * arc.middle[0] + across[1] * arc.middle[1] + across[2] * arc.middle[2]) > arc.reach:
                continue
            for x in common_points(way, arc):
                # Within the way's half circle about its middle, cheaper than its angle.
                if dot(x, half_way) > dot(p, half_way) and arc.meets(x) is not None:
                    crossed += 1
        return crossed % 2 == 1


def area_to(point, arc):
    """Signed area between a point and an arc: triangle with its chord, and the lens (closed form)."""
    a, b, c = point, arc.start, arc.end
    total = TWO * gmpy2.atan2(dot(a, cross(sub(b, a), sub(c, a))), 1 + dot(a, b) + dot(b, c) + dot(c, a))
    if arc.d != 0:
        t = (1 - arc.d) / (1 + arc.d)
        theta = arc.angle
        total += theta * (1 - arc.d) - 2 * gmpy2.atan2(t * gmpy2.sin(theta), 1 + t * gmpy2.cos(theta))
    return total


def inner_parts(piece, other, keep_shared):
    """Parts of a piece's arcs within the other piece. Of edges in common one copy counts, where both run alike."""
    for arc in piece.arcs:
        cuts = [ZERO, arc.angle]
        shared = []
        for near in other.arcs:
            if far(arc, near):
                continue
            sense = same_circle(arc, near)
            if sense == 0:
                cuts += crossings(arc, near)
                continue
            shared.append((near, sense))
            cuts += [angle for angle in (arc.meets(near.start), arc.meets(near.end)) if angle is not None]
        cuts.sort()
        for low, high in zip(cuts, cuts[1:]):
            if (high - low) ** 2 * arc.radius2 < ON * ON:
                continue
            middle = arc.at((low + high) / 2)
            along = [sense for near, sense in shared if near.meets(middle) is not None]
            if along:
                inside = along[0] > 0 and keep_shared
            else:
                inside = other.holds(middle)
            if inside:
                yield arc.part(low, high)


def overlap(a, b):
    total = ZERO
    for one in a:
        for other in b:
            parts = list(inner_parts(one, other, True)) + list(inner_parts(other, one, False))
            if not parts:
                continue
            area = sum((area_to(parts[0].start, p) for p in parts), ZERO)
            area -= 4 * PI * gmpy2.rint(area / (4 * PI))
            if area < -mpfr(10) ** -28:
                raise ValueError(f"an overlap of {area} sr")
            total += area
    return total


def bound(cell):
    return 1e-12 * cell["area"] + 8 * EPS * cell["perimeter"]


def check_oracle():
    """The oracle itself on areas that are known: an octant, a polar cap and what they share."""
    r = math.sqrt(0.5)
    octant = [[[1, 0, 0], [0, 1, 0], [0, 0, 1], 0, math.pi / 2], [[0, 1, 0], [0, 0, 1], [1, 0, 0], 0, math.pi / 2],
              [[0, 0, 1], [1, 0, 0], [0, 1, 0], 0, math.pi / 2]]
    cap = [[[r, 0, r], [0, r, r], [0, 0, 1], r, math.pi / 2], [[0, r, r], [-r, 0, r], [0, 0, 1], r, math.pi / 2],
           [[-r, 0, r], [0, -r, r], [0, 0, 1], r, math.pi / 2], [[0, -r, r], [r, 0, r], [0, 0, 1], r, math.pi / 2]]
    known = {"octant and itself": (octant, octant, PI / 2), "cap and itself": (cap, cap, 2 * PI * (1 - mpfr(r))),
             "octant and cap": (octant, cap, PI / 2 * (1 - mpfr(r)))}
    for name, (a, b, area) in known.items():
        off = abs(overlap([Piece(a)], [Piece(b)]) - area)
        if off > 1e-15:  # the square root of a half is a double
            raise ValueError(f"the oracle misses a known area, {name}, by {float(off)}")


def main(tool, count, seed):
    check_oracle()
    text = subprocess.run([tool, "mixed", count, seed], check=True, capture_output=True, text=True).stdout
    worst, pairs, meeting, failed = {}, {}, 0, 0
    for number, line in enumerate(text.splitlines()):
        pair = json.loads(line.replace("nan", "NaN"))
        cells = pair["cells"]
        a, b = ([Piece(arcs) for arcs in cell["pieces"]] for cell in cells)
        exact = overlap(a, b)
        meeting += exact > 0
        for cell, found in zip(cells, pair["overlap"]):
            ratio = float(abs(mpfr(found) - exact)) / bound(cell)
            key = pair["relation"]
            pairs[key] = pairs.get(key, 0) + 1
            worst[key] = max(worst.get(key, 0), ratio)
            if not ratio <= 1:
                failed += 1
                print(f"FAIL pair {number}, {key}: overlap {found!r}, oracle {float(exact)!r}, {ratio:.3g} of the bound; "
                      f"areas {cells[0]['area']:.3g}, {cells[1]['area']:.3g}")
    for key in sorted(worst, key=worst.get)[-8:]:
        print(f"{key}: {pairs[key]} overlaps, worst {worst[key]:.3f} of the bound")
    print(f"{sum(pairs.values())} overlaps of {number + 1} pairs ({meeting} not empty), worst "
          f"{max(worst.values()):.3f} of the bound; {failed} fail")
    return failed == 0


if __name__ == "__main__":
    sys.exit(0 if main(*sys.argv[1:]) else 1)
