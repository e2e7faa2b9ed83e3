"""Moments of triangle meshes in exact rational arithmetic (standard library only).

A mesh is a list of triangles, a triangle three points, a point three floats (taken as the exact
binary fractions that they are). Lengths keep the unit of the coordinates.

Signed tetrahedra about the origin: with d = a.(b x c), s = a + b + c,
    V = sum d / 6,   integral x = sum d s / 24,
    integral x x^T = sum d (s s^T + a a^T + b b^T + c c^T) / 120.
Textbook result (for instance Tonon 2004, J. Math. Stat. 1(1)); no rounding happens before the end.
"""
from fractions import Fraction


def _integers(triangles):
    """All coordinates as integers over one power of two: (integer triangles, denominator)."""
    ratios = [[[float(x).as_integer_ratio() for x in p] for p in t] for t in triangles]
    scale = max((d for t in ratios for p in t for _, d in p), default=1)
    # One factor of two more, so that the middle of the bounding box is an integer as well.
    scale *= 2
    return [[[n * (scale // d) for n, d in p] for p in t] for t in ratios], scale


def _det(a, b, c):
    return (a[0] * (b[1] * c[2] - b[2] * c[1])
            + a[1] * (b[2] * c[0] - b[0] * c[2])
            + a[2] * (b[0] * c[1] - b[1] * c[0]))


class Moments:
    """Exact volume, centroid and inertia about the centroid (tensor, off-diagonals minus)."""

    def __init__(self, triangles):
        whole, scale = _integers(triangles)
        corners = [p for t in whole for p in t]
        low = [min(p[i] for p in corners) for i in range(3)]
        high = [max(p[i] for p in corners) for i in range(3)]
        middle = [(low[i] + high[i]) // 2 for i in range(3)]
        volume, absolute = 0, 0
        first = [0] * 3
        second = [[0] * 3 for _ in range(3)]
        for t in whole:
            a, b, c = ([p[i] - middle[i] for i in range(3)] for p in t)
            d = _det(a, b, c)
            volume += d
            absolute += abs(d)
            s = [a[i] + b[i] + c[i] for i in range(3)]
            for i in range(3):
                first[i] += d * s[i]
                for j in range(i, 3):
                    second[i][j] += d * (s[i] * s[j] + a[i] * a[j] + b[i] * b[j] + c[i] * c[j])
        self.volume = Fraction(volume, 6 * scale ** 3)
        self.k = Fraction(absolute, 6 * scale ** 3)
        self.low = [Fraction(x, scale) for x in low]
        self.high = [Fraction(x, scale) for x in high]
        self.diagonal = float(sum((h - l) ** 2 for l, h in zip(self.low, self.high))) ** 0.5
        self.centroid = self.inertia = None
        if volume:
            offset = [Fraction(first[i], 4 * volume * scale) for i in range(3)]
            self.centroid = [Fraction(middle[i], scale) + offset[i] for i in range(3)]
            about = [[Fraction(second[min(i, j)][max(i, j)], 120 * scale ** 5)
                      - self.volume * offset[i] * offset[j] for j in range(3)] for i in range(3)]
            trace = about[0][0] + about[1][1] + about[2][2]
            self.inertia = [[(trace if i == j else 0) - about[i][j] for j in range(3)]
                            for i in range(3)]

    @property
    def condition(self):
        """K / |V|."""
        return float(self.k / abs(self.volume))


def area(triangles):
    """Surface area, correctly rounded terms."""
    total = 0.0
    for a, b, c in triangles:
        u = [Fraction(b[i]) - Fraction(a[i]) for i in range(3)]
        v = [Fraction(c[i]) - Fraction(a[i]) for i in range(3)]
        n = [u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]]
        total += float(sum(x * x for x in n)) ** 0.5 / 2
    return total
