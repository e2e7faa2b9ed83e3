//! Named bodies on a grid of coordinates, and the few shapes that the demo is built from.
//!
//! Lengths are millimetres. Every coordinate is a whole number of grid steps: the last bit of the
//! platform's sine then never reaches a file, and faces that must meet do so bit for bit.

use std::collections::BTreeMap;
use std::f64::consts::TAU;

use earcut::Earcut;

/// A point, in millimetres.
pub(crate) type Point = [f64; 3];

/// Steps per millimetre that a 32-bit float holds exactly up to 16 m: for binary STL.
pub(crate) const BINARY_GRID: f64 = 1024.0;
/// Micrometres: short decimals, for the text formats.
pub(crate) const TEXT_GRID: f64 = 1000.0;

/// The axis that a profile is extruded along or turned about; `(u, v)` span the plane across it.
#[derive(Clone, Copy)]
pub(crate) enum Axis {
    X,
    Y,
    Z,
}

impl Axis {
    /// The point at `(u, v)` across the axis and `w` along it; `(u, v, w)` is right-handed.
    fn point(self, u: f64, v: f64, w: f64) -> Point {
        match self {
            Self::X => [w, u, v],
            Self::Y => [v, w, u],
            Self::Z => [u, v, w],
        }
    }
}

/// One named body: shared vertices in grid steps, and polygons counter-clockwise from outside.
#[derive(Clone)]
pub(crate) struct Body {
    pub(crate) name: String,
    grid: f64,
    keys: Vec<[i64; 3]>,
    index: BTreeMap<[i64; 3], usize>,
    pub(crate) faces: Vec<Vec<usize>>,
}

impl Body {
    pub(crate) fn new(name: &str, grid: f64) -> Self {
        Self {
            name: name.to_owned(),
            grid,
            keys: Vec::new(),
            index: BTreeMap::new(),
            faces: Vec::new(),
        }
    }

    pub(crate) fn vertex_count(&self) -> usize {
        self.keys.len()
    }

    pub(crate) fn vertex(&self, i: usize) -> Point {
        self.keys[i].map(|k| k as f64 / self.grid)
    }

    fn insert(&mut self, p: Point) -> usize {
        let key = p.map(|c| (c * self.grid).round() as i64);
        let keys = &mut self.keys;
        *self.index.entry(key).or_insert_with(|| {
            keys.push(key);
            keys.len() - 1
        })
    }

    /// A polygon; corners that fall on one grid point become one, and what is left of fewer than
    /// three is no face (the poles of a turned profile).
    pub(crate) fn face(&mut self, corners: &[Point]) {
        let mut face: Vec<usize> = corners.iter().map(|&p| self.insert(p)).collect();
        face.dedup();
        while face.len() > 1 && face.first() == face.last() {
            face.pop();
        }
        if face.len() >= 3 {
            self.faces.push(face);
        }
    }

    /// A flat face across `axis` at `w` with holes, triangulated; `up`: seen from +axis.
    pub(crate) fn pierced(
        &mut self,
        axis: Axis,
        w: f64,
        outline: &[[f64; 2]],
        holes: &[Outline],
        up: bool,
    ) {
        let loops: Vec<&[[f64; 2]]> = std::iter::once(outline)
            .chain(holes.iter().map(|h| h.0.as_slice()))
            .collect();
        let mut ids = Vec::new();
        let mut flat = Vec::new();
        let mut starts: Vec<u32> = Vec::new();
        for (n, one) in loops.iter().enumerate() {
            if n > 0 {
                starts.push(u32::try_from(flat.len()).expect("a demo face is small"));
            }
            for p in *one {
                ids.push(self.insert(axis.point(p[0], p[1], w)));
                flat.push(p.map(|c| (c * self.grid).round() / self.grid));
            }
        }
        let mut triangles: Vec<u32> = Vec::new();
        Earcut::new().earcut(flat.iter().copied(), &starts, &mut triangles);
        for t in triangles.chunks_exact(3) {
            let [a, b, c] = [t[0] as usize, t[1] as usize, t[2] as usize];
            let (p, q, r) = (flat[a], flat[b], flat[c]);
            let area = (q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0]);
            let face = if (area > 0.0) == up {
                [a, b, c]
            } else {
                [a, c, b]
            };
            self.faces.push(face.map(|i| ids[i]).to_vec());
        }
    }

    /// The wall between two copies of a counter-clockwise loop, facing away from the loop's inside
    /// (`outward`) or towards it.
    pub(crate) fn wall(
        &mut self,
        axis: Axis,
        one: &[[f64; 2]],
        low: f64,
        high: f64,
        outward: bool,
    ) {
        for (i, p) in one.iter().enumerate() {
            let q = one[(i + 1) % one.len()];
            let mut quad = [
                axis.point(p[0], p[1], low),
                axis.point(q[0], q[1], low),
                axis.point(q[0], q[1], high),
                axis.point(p[0], p[1], high),
            ];
            if !outward {
                quad.reverse();
            }
            self.face(&quad);
        }
    }

    /// A prism from `low` to `high` along `axis`, with through holes.
    pub(crate) fn extrude(
        &mut self,
        axis: Axis,
        outline: &Outline,
        holes: &[Outline],
        low: f64,
        high: f64,
    ) {
        self.pierced(axis, low, &outline.0, holes, false);
        self.pierced(axis, high, &outline.0, holes, true);
        self.wall(axis, &outline.0, low, high, true);
        for hole in holes {
            self.wall(axis, &hole.0, low, high, false);
        }
    }

    /// A prism whose end faces stay polygons.
    pub(crate) fn prism(&mut self, axis: Axis, outline: &Outline, low: f64, high: f64) {
        let ring = |w: f64| outline.0.iter().map(move |p| axis.point(p[0], p[1], w));
        self.face(&ring(low).rev().collect::<Vec<_>>());
        self.face(&ring(high).collect::<Vec<_>>());
        self.wall(axis, &outline.0, low, high, true);
    }

    /// A profile of (radius, height) turned about `axis` through `centre` (across the axis), in
    /// `n` steps. The solid lies to the left of the profile's direction of travel. A `ring` joins
    /// the last point to the first; else both ends stand on the axis, or close the body otherwise.
    pub(crate) fn revolve(
        &mut self,
        axis: Axis,
        centre: [f64; 2],
        profile: &[[f64; 2]],
        n: usize,
        ring: bool,
    ) {
        let at = |p: [f64; 2], j: usize| {
            let (s, c) = (TAU * (j % n) as f64 / n as f64).sin_cos();
            axis.point(centre[0] + p[0] * c, centre[1] + p[0] * s, p[1])
        };
        let spans = if ring {
            profile.len()
        } else {
            profile.len() - 1
        };
        for i in 0..spans {
            let (p, q) = (profile[i], profile[(i + 1) % profile.len()]);
            for j in 0..n {
                self.face(&[at(p, j), at(p, j + 1), at(q, j + 1)]);
                self.face(&[at(p, j), at(q, j + 1), at(q, j)]);
            }
        }
    }

    /// An upright box section along `axis`, open at both ends, with round holes drilled across
    /// both walls that `v` points at. `size` is (u, v) of the outside, centred on `centre`.
    pub(crate) fn drilled_tube(
        &mut self,
        axis: Axis,
        centre: [f64; 2],
        size: [f64; 2],
        thickness: f64,
        span: [f64; 2],
        drill: (&[f64], f64),
    ) {
        let [low, high] = span;
        let inner = [size[0] - 2.0 * thickness, size[1] - 2.0 * thickness];
        let (outer, inner) = (Outline::rect(centre, size), Outline::rect(centre, inner));
        for end in [low, high] {
            self.pierced(
                axis,
                end,
                &outer.0,
                std::slice::from_ref(&inner),
                end == high,
            );
        }
        // Across v the same walls are flat faces over (w, u): the axis that follows in the cycle.
        let across = match axis {
            Axis::X => Axis::Z,
            Axis::Y => Axis::X,
            Axis::Z => Axis::Y,
        };
        let half = [size[1] / 2.0, size[1] / 2.0 - thickness];
        let holes: Vec<Outline> = drill
            .0
            .iter()
            .map(|&w| Outline::circle([w, centre[0]], drill.1, 24))
            .collect();
        for (one, v, facing_out) in [(&outer, half[0], true), (&inner, half[1], false)] {
            let (u0, u1) = (one.0[0][0], one.0[1][0]);
            let plate = [[low, u0], [high, u0], [high, u1], [low, u1]];
            for side in [-1.0, 1.0] {
                let up = (side > 0.0) == facing_out;
                self.pierced(across, centre[1] + side * v, &plate, &holes, up);
            }
            let (v0, v1) = (one.0[0][1], one.0[2][1]);
            for (u, sign) in [(u0, -1.0), (u1, 1.0)] {
                let mut quad = [
                    axis.point(u, v0, low),
                    axis.point(u, v1, low),
                    axis.point(u, v1, high),
                    axis.point(u, v0, high),
                ];
                // v × w = u: this order faces +u.
                if (sign > 0.0) != facing_out {
                    quad.reverse();
                }
                self.face(&quad);
            }
        }
        for hole in &holes {
            for [a, b] in [[-half[0], -half[1]], [half[1], half[0]]] {
                self.wall(across, &hole.0, centre[1] + a, centre[1] + b, false);
            }
        }
    }

    /// Every face seen from its other side.
    pub(crate) fn turn_inside_out(&mut self) {
        for face in &mut self.faces {
            face.reverse();
        }
    }

    /// Triangles as the writers put them down: fans, so only of convex faces.
    pub(crate) fn triangles(&self) -> Vec<[Point; 3]> {
        let fan = |f: &Vec<usize>| {
            let f = f.clone();
            (1..f.len() - 1).map(move |i| [f[0], f[i], f[i + 1]])
        };
        self.faces
            .iter()
            .flat_map(fan)
            .map(|t| t.map(|i| self.vertex(i)))
            .collect()
    }
}

/// A simple closed outline in a plane, counter-clockwise.
#[derive(Clone)]
pub(crate) struct Outline(pub(crate) Vec<[f64; 2]>);

impl Outline {
    pub(crate) fn rect(centre: [f64; 2], size: [f64; 2]) -> Self {
        let [x, y] = [size[0] / 2.0, size[1] / 2.0];
        let at = |u: f64, v: f64| [centre[0] + u, centre[1] + v];
        Self(vec![at(-x, -y), at(x, -y), at(x, y), at(-x, y)])
    }

    pub(crate) fn circle(centre: [f64; 2], radius: f64, n: usize) -> Self {
        let at = |j: usize| {
            let (s, c) = (TAU * j as f64 / n as f64).sin_cos();
            [centre[0] + radius * c, centre[1] + radius * s]
        };
        Self((0..n).map(at).collect())
    }

    /// A rectangle with round corners of `steps` chords each.
    pub(crate) fn rounded(centre: [f64; 2], size: [f64; 2], radius: f64, steps: usize) -> Self {
        let mut points = Vec::new();
        for (quarter, (sx, sy)) in [(1.0, 1.0), (-1.0, 1.0), (-1.0, -1.0), (1.0, -1.0)]
            .into_iter()
            .enumerate()
        {
            let middle = [
                centre[0] + sx * (size[0] / 2.0 - radius),
                centre[1] + sy * (size[1] / 2.0 - radius),
            ];
            for k in 0..=steps {
                let turn = (quarter as f64 + k as f64 / steps as f64) / 4.0;
                let (s, c) = (TAU * turn).sin_cos();
                points.push([middle[0] + radius * c, middle[1] + radius * s]);
            }
        }
        Self(points)
    }
}

/// `steps` chords of a quarter circle of `radius` about `centre`, from angle `from` (in quarter
/// turns of the (radius, height) plane), both ends included.
pub(crate) fn arc(
    centre: [f64; 2],
    radius: f64,
    from: f64,
    to: f64,
    steps: usize,
) -> Vec<[f64; 2]> {
    (0..=steps)
        .map(|k| {
            let quarter = from + (to - from) * k as f64 / steps as f64;
            let (s, c) = (TAU * quarter / 4.0).sin_cos();
            [centre[0] + radius * c, centre[1] + radius * s]
        })
        .collect()
}
