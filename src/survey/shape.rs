//! Are two bodies the same shape, up to a rigid motion or its mirror image?
//!
//! Principal axes do not tell how to lay one on the other: a cube, a ball and a gear leave them
//! undetermined. Here one vertex and a second one, beside the centroid, fix the motion: for a pair
//! of the first body all pairs of the second are tried that stand alike. What stands alike is told
//! by sums over all vertices that no motion and no mirroring changes, f_p(v) = Σ_w (v·w)^p / n seen
//! from the centroid; the pair is taken where these leave the fewest to try. A motion counts only
//! once every vertex has been found at its place, both ways.

use std::collections::HashMap;

use nalgebra::{Matrix3, Vector3};

use crate::geometry::{LooseFacets, Select};
use crate::moments::{integrate, principal};

/// Orders of the sums that tell vertices apart.
const ORDERS: [u32; 4] = [2, 3, 4, 6];
/// The vertex's distance from the centroid, then those sums.
const MARKS: usize = 1 + ORDERS.len();
type Marks = [f64; MARKS];

/// Looks at one vertex after which a comparison is given up: seconds.
const PATIENCE: u64 = 2_000_000_000;

/// A body as its distinct vertices about its centroid, m.
#[derive(Clone, Debug)]
pub struct Shape {
    points: Vec<Vector3<f64>>,
    marks: Vec<Marks>,
    radius: f64,
    /// How far a vertex may lie from where it should.
    within: f64,
    volume: f64,
    area: f64,
    principal: [f64; 3],
}

/// What a comparison came to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Likeness {
    /// The same shape; mirrored where no motion alone lays one on the other.
    Same {
        /// Whether it takes a mirroring.
        mirrored: bool,
    },
    /// Not the same.
    Different,
    /// So many vertices stand alike that it was given up.
    Undecided,
}

impl Shape {
    /// Of a closed body's triangles, turned outward, m. `None` where it has no volume.
    ///
    /// Vertices agree within a millionth of the box's diagonal, or twice the rounding of f32 at the
    /// body's farthest coordinate if that is more: what exporting in another place does.
    pub fn of(facets: &[[[f64; 3]; 3]]) -> Option<Self> {
        let first = facets.first()?[0];
        let solid = integrate(&LooseFacets(facets), Select::All, first, first);
        let centre = solid.moments.centre()?;
        let inertia = solid.moments.inertia()?;
        let mut points: Vec<[u64; 3]> = facets
            .iter()
            .flatten()
            .map(|p| p.map(|x| (x + 0.0).to_bits()))
            .collect();
        points.sort_unstable();
        points.dedup();
        let points: Vec<Vector3<f64>> = points
            .into_iter()
            .map(|p| Vector3::from(p.map(f64::from_bits)) - centre)
            .collect();
        let radius = points.iter().map(Vector3::norm).fold(0.0, f64::max);
        let far = facets
            .iter()
            .flatten()
            .flatten()
            .fold(0.0, |a: f64, x| a.max(x.abs()));
        let rounding = f64::from(f32::EPSILON) * far;
        let mut shape = Self {
            marks: Vec::new(),
            radius,
            // The diagonal is at most twice the radius about the centroid.
            within: (2e-6 * radius).max(rounding),
            volume: solid.moments.zeroth,
            area: solid.area,
            principal: principal(&inertia).moments,
            points: shuffled(points),
        };
        shape.marks = marks(&shape.points, radius);
        (radius > 0.0 && shape.volume > 0.0).then_some(shape)
    }

    /// Bytes that it takes.
    pub fn bytes(&self) -> u64 {
        (self.points.len() * (size_of::<Vector3<f64>>() + size_of::<Marks>())) as u64
    }

    /// Whether `other` is this shape.
    pub fn compare(&self, other: &Self) -> Likeness {
        let within = self.within.max(other.within);
        let (r, n) = (self.radius.max(other.radius), self.points.len());
        // Moving every vertex by no more than this moves the volume by no more than the area times
        // it, and the moments by a few times that at the square of the radius.
        let volume = 2.0 * within * self.area.max(other.area) + 1e-12 * self.volume;
        let alike = n == other.points.len()
            && (self.radius - other.radius).abs() <= 4.0 * within
            && (self.volume - other.volume).abs() <= volume
            && (0..3)
                .all(|i| (self.principal[i] - other.principal[i]).abs() <= 8.0 * volume * r * r);
        if !alike {
            return Likeness::Different;
        }
        let mut search = Search {
            a: self,
            b: other,
            within,
            grid: Grid::of(&other.points, ROUGH * within),
            back: Grid::of(&self.points, ROUGH * within),
            looks: 0,
        };
        search.run()
    }
}

/// The first motion comes from two vertices alone; how much farther off it may be.
const ROUGH: f64 = 60.0;

struct Search<'a> {
    a: &'a Shape,
    b: &'a Shape,
    within: f64,
    grid: Grid<'a>,
    back: Grid<'a>,
    looks: u64,
}

impl Search<'_> {
    fn run(&mut self) -> Likeness {
        let like = |x: &Marks, y: &Marks| -> bool {
            let e = 8.0 * self.within / self.a.radius;
            let order = |i: usize| {
                if i == 0 {
                    1.0
                } else {
                    f64::from(ORDERS[i - 1])
                }
            };
            (0..MARKS).all(|i| (x[i] - y[i]).abs() <= order(i) * e + 1e-9)
        };
        let (a, b) = (self.a, self.b);
        let of_b = |i: usize| -> Vec<usize> {
            (0..b.points.len())
                .filter(|&j| like(&a.marks[i], &b.marks[j]))
                .collect()
        };
        let fewest = |from: Vec<usize>| {
            from.into_iter()
                .map(|i| (i, of_b(i)))
                .min_by_key(|(_, l)| l.len())
        };
        // The farthest vertex is always among them.
        let Some((first, firsts)) = fewest(extremes(a, |i| a.marks[i][0] > 0.3)) else {
            return Likeness::Different;
        };
        let p = a.points[first];
        let beside = |i: usize| {
            let q = a.points[i];
            a.marks[i][0] > 0.2 && p.cross(&q).norm() > 0.3 * p.norm() * q.norm()
        };
        let mut seconds = extremes(a, beside);
        if seconds.is_empty() {
            let away = |i: &usize| p.cross(&a.points[*i]).norm();
            seconds.extend((0..a.points.len()).max_by(|x, y| away(x).total_cmp(&away(y))));
        }
        let Some((second, seconds)) = fewest(seconds) else {
            return Likeness::Different;
        };
        let q = a.points[second];
        let Some(from) = frame(&p, &q, false) else {
            return Likeness::Different;
        };
        let apart = (p - q).norm();
        for mirrored in [false, true] {
            for &i in &firsts {
                self.looks += seconds.len() as u64;
                for &j in &seconds {
                    let (u, v) = (b.points[i], b.points[j]);
                    if ((u - v).norm() - apart).abs() > 16.0 * self.within {
                        continue;
                    }
                    if let Some(to) = frame(&u, &v, mirrored)
                        && self.fits(&(to * from.transpose()), mirrored)
                    {
                        return Likeness::Same { mirrored };
                    }
                }
                if self.looks > PATIENCE {
                    return Likeness::Undecided;
                }
            }
        }
        Likeness::Different
    }

    /// Whether the turn lays every vertex on one of the other body: roughly first, then closely
    /// after it has been made the best for all vertices together (Kabsch, "A solution for the best
    /// rotation to relate two sets of vectors", Acta Cryst. A32, 1976; the determinant chosen).
    fn fits(&mut self, turn: &Matrix3<f64>, mirrored: bool) -> bool {
        let mut h = Matrix3::zeros();
        let (mut mean_a, mut mean_b) = (Vector3::zeros(), Vector3::zeros());
        for p in &self.a.points {
            self.looks += 1;
            let Some(q) = self.grid.nearest(&(turn * p), ROUGH * self.within) else {
                return false;
            };
            h += q * p.transpose();
            mean_a += p;
            mean_b += q;
        }
        let n = self.a.points.len() as f64;
        (mean_a, mean_b) = (mean_a / n, mean_b / n);
        h -= mean_b * mean_a.transpose() * n;
        let svd = h.svd(true, true);
        let (Some(u), Some(v)) = (svd.u, svd.v_t) else {
            return false;
        };
        let sign = if mirrored { -1.0 } else { 1.0 };
        // Singular values descend: the last axis is the one that costs least to turn.
        let last = sign * (u * v).determinant().signum();
        let turn = u * Matrix3::from_diagonal(&Vector3::new(1.0, 1.0, last)) * v;
        let onto = |p: &Vector3<f64>| turn * (p - mean_a) + mean_b;
        let back = |q: &Vector3<f64>| turn.transpose() * (q - mean_b) + mean_a;
        self.looks += 2 * self.a.points.len() as u64;
        // Either may be off by as much.
        let close = 2.0 * self.within;
        self.a
            .points
            .iter()
            .all(|p| self.grid.nearest(&onto(p), close).is_some())
            && self
                .b
                .points
                .iter()
                .all(|q| self.back.nearest(&back(q), close).is_some())
    }
}

/// Right-handed axes by two vectors, or left-handed ones; `None` where they lie in one line.
fn frame(p: &Vector3<f64>, q: &Vector3<f64>, mirrored: bool) -> Option<Matrix3<f64>> {
    let x = p.try_normalize(0.0)?;
    let z = p.cross(q).try_normalize(1e-9 * p.norm() * q.norm())?;
    let y = z.cross(&x);
    Some(Matrix3::from_columns(&[
        x,
        y,
        if mirrored { -z } else { z },
    ]))
}

/// Vertices with the least and the greatest of each mark among those wanted.
fn extremes(shape: &Shape, wanted: impl Fn(usize) -> bool) -> Vec<usize> {
    let all: Vec<usize> = (0..shape.points.len()).filter(|&i| wanted(i)).collect();
    let mut out = Vec::new();
    for m in 0..MARKS {
        let by = |i: &&usize, j: &&usize| shape.marks[**i][m].total_cmp(&shape.marks[**j][m]);
        out.extend(all.iter().min_by(by));
        out.extend(all.iter().max_by(by));
    }
    out.sort_unstable();
    out.dedup();
    out
}

/// In an order that has nothing to do with where they lie: a wrong motion is found out soon.
fn shuffled(mut points: Vec<Vector3<f64>>) -> Vec<Vector3<f64>> {
    let mut state = 0x2545_f491_4f6c_dd1du64;
    for i in (1..points.len()).rev() {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        points.swap(i, (state % (i as u64 + 1)) as usize);
    }
    points
}

/// Distance and sums of every vertex, of lengths as parts of the radius. The sum over all others of
/// (v·w)^p is a polynomial in v whose coefficients are sums over all vertices: one pass makes them.
fn marks(points: &[Vector3<f64>], radius: f64) -> Vec<Marks> {
    let unit = |p: &Vector3<f64>| p / radius.max(f64::MIN_POSITIVE);
    let n = points.len() as f64;
    let sums: Vec<Vec<([i32; 3], f64)>> = ORDERS
        .iter()
        .map(|&order| {
            let mut terms = monomials(order);
            for (powers, factor) in &mut terms {
                let sum: f64 = points.iter().map(|p| value(&unit(p), powers)).sum();
                *factor *= sum / n;
            }
            terms
        })
        .collect();
    points
        .iter()
        .map(|p| {
            let p = unit(p);
            let mut out = [p.norm(); MARKS];
            for (mark, terms) in out[1..].iter_mut().zip(&sums) {
                *mark = terms.iter().map(|(powers, f)| f * value(&p, powers)).sum();
            }
            out
        })
        .collect()
}

fn value(p: &Vector3<f64>, powers: &[i32; 3]) -> f64 {
    p.x.powi(powers[0]) * p.y.powi(powers[1]) * p.z.powi(powers[2])
}

/// Powers of x, y, z of that order, with their multinomial coefficients.
fn monomials(order: u32) -> Vec<([i32; 3], f64)> {
    let factorial = |n: u32| (1..=n).map(f64::from).product::<f64>();
    let mut out = Vec::new();
    for i in 0..=order {
        for j in 0..=order - i {
            let k = order - i - j;
            let c = factorial(order) / (factorial(i) * factorial(j) * factorial(k));
            // An order is below ten.
            out.push(([i as i32, j as i32, k as i32], c));
        }
    }
    out
}

/// Points by cells.
struct Grid<'a> {
    points: &'a [Vector3<f64>],
    cells: HashMap<[i64; 3], Vec<u32>>,
    size: f64,
}

impl<'a> Grid<'a> {
    /// For searches within `reach`.
    fn of(points: &'a [Vector3<f64>], reach: f64) -> Self {
        let size = 2.0 * reach;
        let mut cells: HashMap<[i64; 3], Vec<u32>> = HashMap::with_capacity(points.len());
        for (i, p) in points.iter().enumerate() {
            // Distinct vertices of a mesh are fewer than 2³².
            cells.entry(cell(p, size)).or_default().push(i as u32);
        }
        Self {
            points,
            cells,
            size,
        }
    }

    /// The nearest point within `reach`, which is at most that of the grid.
    fn nearest(&self, p: &Vector3<f64>, reach: f64) -> Option<&'a Vector3<f64>> {
        let r = Vector3::repeat(reach);
        let (low, high) = (cell(&(p - r), self.size), cell(&(p + r), self.size));
        let mut best = reach * reach;
        let mut found = None;
        for x in low[0]..=high[0] {
            for y in low[1]..=high[1] {
                for z in low[2]..=high[2] {
                    for &i in self.cells.get(&[x, y, z]).into_iter().flatten() {
                        let q = &self.points[i as usize];
                        let d = (q - p).norm_squared();
                        if d <= best {
                            (best, found) = (d, Some(q));
                        }
                    }
                }
            }
        }
        found
    }
}

fn cell(p: &Vector3<f64>, size: f64) -> [i64; 3] {
    // A radius is at most half a million cells.
    [p.x, p.y, p.z].map(|x| (x / size).floor() as i64)
}
