//! Solids as a CAD export has them, made in code: distance functions meshed by marching tetrahedra
//! (six to a cell, each face shared: the surface is closed by construction), rounded to f32.

use std::collections::HashMap;

pub(crate) type P = [f64; 3];
pub(crate) type Facets = Vec<[P; 3]>;

/// A small generator of numbers (xorshift64*; Vigna 2016), so that every run sees the same solids.
pub(crate) struct Dice(pub(crate) u64);

impl Dice {
    pub(crate) fn next(&mut self) -> u64 {
        self.0 ^= self.0 >> 12;
        self.0 ^= self.0 << 25;
        self.0 ^= self.0 >> 27;
        self.0.wrapping_mul(0x2545_f491_4f6c_dd1d)
    }
    /// Evenly in [low, high).
    pub(crate) fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * (self.next() >> 11) as f64 / (1u64 << 53) as f64
    }
    pub(crate) fn below(&mut self, n: usize) -> usize {
        (self.next() % n as u64) as usize
    }
}

fn block(p: P, half: P, round: f64) -> f64 {
    let q = [0, 1, 2].map(|k| p[k].abs() - half[k] + round);
    let out = q.map(|x| x.max(0.0));
    (out[0] * out[0] + out[1] * out[1] + out[2] * out[2]).sqrt() + q[0].max(q[1]).max(q[2]).min(0.0)
        - round
}

fn bore(p: P, x: f64, y: f64, r: f64) -> f64 {
    ((p[0] - x).powi(2) + (p[1] - y).powi(2)).sqrt() - r
}

pub(crate) const KINDS: usize = 6;

/// A solid of one of the kinds with sizes drawn: distances are negative inside; the cube of ±1.3
/// holds it.
pub(crate) fn solid(kind: usize, dice: &mut Dice) -> Box<dyn Fn(P) -> f64> {
    let mut draw = |low, high| dice.between(low, high);
    match kind % KINDS {
        // Drilled plate.
        0 => {
            let (h, r) = (draw(0.25, 0.5), draw(0.15, 0.35));
            let (x, y) = (draw(-0.5, 0.5), draw(-0.4, 0.4));
            Box::new(move |p| block(p, [1.03, 0.87, h], 0.0).max(-bore(p, x, y, r)))
        }
        // Filleted block.
        1 => {
            let (half, r) = (
                [draw(0.6, 1.1), draw(0.6, 1.1), draw(0.5, 1.1)],
                draw(0.1, 0.4),
            );
            Box::new(move |p| block(p, half, r))
        }
        // Ribbed plate.
        2 => {
            let (t, h, x) = (draw(0.2, 0.35), draw(0.5, 0.8), draw(0.3, 0.6));
            Box::new(move |p| {
                let rib = |x: f64| block([p[0] - x, p[1], p[2]], [0.17, 0.8, h], 0.0);
                block([p[0], p[1], p[2] + h - t], [1.05, 0.93, t], 0.0)
                    .min(rib(x))
                    .min(rib(-x))
            })
        }
        // Hollow housing, open at a port.
        3 => {
            let (w, r) = (draw(0.25, 0.4), draw(0.2, 0.35));
            Box::new(move |p| {
                let outer = block(p, [1.1, 1.0, 0.9], 0.1);
                let inner = block(p, [1.1 - w, 1.0 - w, 0.9 - w], 0.0);
                let port = bore(p, 0.05, -0.1, r).max(-p[2]);
                outer.max(-inner).max(-port)
            })
        }
        // Ring.
        4 => {
            let (big, small) = (draw(0.6, 0.85), draw(0.2, 0.4));
            Box::new(move |p| {
                let q = (p[0] * p[0] + p[1] * p[1]).sqrt() - big;
                (q * q + p[2] * p[2]).sqrt() - small
            })
        }
        // Ball, not round everywhere.
        _ => {
            let half = [draw(0.6, 1.2), draw(0.6, 1.2), draw(0.6, 1.2)];
            Box::new(move |p| {
                let q = [0, 1, 2].map(|k| p[k] / half[k]);
                (q[0] * q[0] + q[1] * q[1] + q[2] * q[2]).sqrt() - 1.0
            })
        }
    }
}

/// The surface of f = 0 in the cube of ±1.3, outward, with `n` cells a side.
pub(crate) fn mesh(f: &dyn Fn(P) -> f64, n: usize) -> Facets {
    const TETS: [[usize; 4]; 6] = [
        [0, 5, 1, 6],
        [0, 1, 2, 6],
        [0, 2, 3, 6],
        [0, 3, 7, 6],
        [0, 7, 4, 6],
        [0, 4, 5, 6],
    ];
    const CORNERS: [[usize; 3]; 8] = [
        [0, 0, 0],
        [1, 0, 0],
        [1, 1, 0],
        [0, 1, 0],
        [0, 0, 1],
        [1, 0, 1],
        [1, 1, 1],
        [0, 1, 1],
    ];
    let m = n + 1;
    let at =
        |i: usize| [i % m, i / m % m, i / m / m].map(|x| -1.3 + 2.6 * x as f64 / n as f64 + 1e-4);
    let values: Vec<f64> = (0..m * m * m).map(|i| f(at(i))).collect();
    let mut made: HashMap<(usize, usize), P> = HashMap::new();
    let mut out = Vec::new();
    for cell in 0..n * n * n {
        let (x, y, z) = (cell % n, cell / n % n, cell / n / n);
        let corner = CORNERS.map(|c| x + c[0] + m * (y + c[1] + m * (z + c[2])));
        for tet in TETS {
            let v = tet.map(|i| corner[i]);
            let (inside, outside): (Vec<usize>, Vec<usize>) =
                v.iter().partition(|&&i| values[i] < 0.0);
            let mut cut = |a: usize, b: usize| {
                let (a, b) = (a.min(b), a.max(b));
                *made.entry((a, b)).or_insert_with(|| {
                    // Kept off the corners, so that no two cuts fall together.
                    let s = (values[a] / (values[a] - values[b])).clamp(0.02, 0.98);
                    let (p, q) = (at(a), at(b));
                    [0, 1, 2].map(|k| f64::from((p[k] + s * (q[k] - p[k])) as f32))
                })
            };
            let ring: Vec<P> = match inside.len() {
                1 => outside.iter().map(|&o| cut(inside[0], o)).collect(),
                3 => inside.iter().map(|&i| cut(i, outside[0])).collect(),
                2 => vec![
                    cut(inside[0], outside[0]),
                    cut(inside[0], outside[1]),
                    cut(inside[1], outside[1]),
                    cut(inside[1], outside[0]),
                ],
                _ => continue,
            };
            let mut put = |mut t: [P; 3]| {
                let n = cross(sub(t[1], t[0]), sub(t[2], t[0]));
                if dot(n, sub(at(inside[0]), t[0])) > 0.0 {
                    t.swap(1, 2);
                }
                out.push(t);
            };
            put([ring[0], ring[1], ring[2]]);
            if let Some(&last) = ring.get(3) {
                put([ring[0], ring[2], last]);
            }
        }
    }
    out
}

pub(crate) fn sub(a: P, b: P) -> P {
    [0, 1, 2].map(|k| a[k] - b[k])
}
pub(crate) fn cross(a: P, b: P) -> P {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}
pub(crate) fn dot(a: P, b: P) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}
pub(crate) fn area(t: &[P; 3]) -> f64 {
    let n = cross(sub(t[1], t[0]), sub(t[2], t[0]));
    dot(n, n).sqrt() / 2.0
}

/// The same surface with its facets cut along the plane x[axis] = at, which then holds edges.
pub(crate) fn cut_at(facets: &Facets, axis: usize, at: f32) -> Facets {
    let at = f64::from(at);
    let side = |p: &P| i8::from(p[axis] > at) - i8::from(p[axis] < at);
    // From the lesser end to the greater, so that both facets of an edge find the same point.
    let middle = |p: &P, q: &P| {
        let (p, q) = if p[axis] < q[axis] { (p, q) } else { (q, p) };
        let s = (at - p[axis]) / (q[axis] - p[axis]);
        let mut m = [0, 1, 2].map(|k| f64::from((p[k] + s * (q[k] - p[k])) as f32));
        m[axis] = at;
        m
    };
    let mut out = Vec::new();
    for t in facets {
        let (mut low, mut high) = (Vec::new(), Vec::new());
        for k in 0..3 {
            let (p, q) = (t[k], t[(k + 1) % 3]);
            let (a, b) = (side(&p), side(&q));
            if a <= 0 {
                low.push(p);
            }
            if a >= 0 {
                high.push(p);
            }
            if a * b < 0 {
                let m = middle(&p, &q);
                low.push(m);
                high.push(m);
            }
        }
        for ring in [low, high] {
            for k in 1..ring.len().saturating_sub(1) {
                let t = [ring[0], ring[k], ring[k + 1]];
                if t[0] != t[1] && t[1] != t[2] && t[2] != t[0] {
                    out.push(t);
                }
            }
        }
    }
    out
}

/// The facets beyond the plane.
pub(crate) fn beyond(facets: &Facets, axis: usize, at: f32) -> std::collections::HashSet<usize> {
    (0..facets.len())
        .filter(|&i| facets[i].iter().any(|p| p[axis] > f64::from(at)))
        .collect()
}
