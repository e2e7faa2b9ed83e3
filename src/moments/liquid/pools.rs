//! Separate pools of a liquid: whether all that lies below one level is connected.

use std::collections::HashMap;

use nalgebra::Vector3;

use super::{Cut, Levelled};

/// Liquid that is connected below the level.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pool {
    /// Its volume.
    pub volume: f64,
    /// Where its centroid is, in the vessel's frame.
    pub centroid: Vector3<f64>,
}

/// A loop of the rim in the plane: counter-clockwise seen from above around liquid, clockwise
/// around what stands out of it.
struct Loop {
    of: usize,
    at: Vec<[f64; 2]>,
    area: f64,
}

/// What is summed of a connected piece of wetted wall.
#[derive(Clone, Copy, Default)]
struct Sums {
    volume: f64,
    first: Vector3<f64>,
}

impl Levelled<'_> {
    /// The pools below the level `h`, the largest first. One vessel with one level may hold
    /// several: each would in truth keep a level of its own.
    ///
    /// Wetted wall that hangs together below the level is one piece. Pieces belong to one pool
    /// where the rim of one stands inside that of the other on the free surface, or where one lies
    /// wholly under water inside the other.
    pub fn pools(&self, h: f64) -> Vec<Pool> {
        if h <= self.low {
            return Vec::new();
        }
        let vessel = self.vessel;
        let mut union = Union::new(vessel.points.len());
        let cuts: Vec<Cut> = vessel.triangles.iter().map(|t| self.cut(t, h)).collect();
        for (t, cut) in vessel.triangles.iter().zip(&cuts) {
            match cut {
                Cut::Dry | Cut::Corner { .. } => {}
                Cut::Wet => {
                    union.join(t[0], t[1]);
                    union.join(t[1], t[2]);
                }
                Cut::Edge { a, b, .. } => union.join(*a, *b),
            }
        }
        // Signed tetrahedra from a point of the plane, by piece.
        let apex = self.up * h;
        let mut sums: HashMap<usize, Sums> = HashMap::new();
        let mut walls: HashMap<usize, Vec<[Vector3<f64>; 3]>> = HashMap::new();
        let mut next: HashMap<(u32, u32), Vec<(u32, u32)>> = HashMap::new();
        let p = |i: u32| vessel.points[i as usize];
        for (t, cut) in vessel.triangles.iter().zip(&cuts) {
            let (root, parts, count) = match *cut {
                Cut::Dry => continue,
                Cut::Wet => (t[0], [t.map(p); 2], 1),
                Cut::Corner { a, rim: [from, to] } => {
                    next.entry(from).or_default().push(to);
                    let (r, q) = (
                        self.crossing(from.0, from.1, h),
                        self.crossing(to.0, to.1, h),
                    );
                    (a, [[p(a), q, r]; 2], 1)
                }
                Cut::Edge {
                    a,
                    b,
                    rim: [from, to],
                } => {
                    next.entry(from).or_default().push(to);
                    let (r, q) = (
                        self.crossing(from.0, from.1, h),
                        self.crossing(to.0, to.1, h),
                    );
                    (a, [[p(a), p(b), q], [p(a), q, r]], 2)
                }
            };
            let root = union.root(root);
            let sum = sums.entry(root).or_default();
            for part in &parts[..count] {
                let [a, b, c] = part.map(|x| x - apex);
                let v = a.dot(&b.cross(&c)) / 6.0;
                sum.volume += v;
                sum.first += (a + b + c) * (v / 4.0);
            }
            walls.entry(root).or_default().extend(&parts[..count]);
        }
        let loops = self.loops(next, &mut union, h);
        let mut pools = Union::new(vessel.points.len());
        for hole in loops.iter().filter(|l| l.area < 0.0) {
            let around = loops
                .iter()
                .filter(|l| l.area > 0.0 && hole.at.first().is_some_and(|p| l.holds(*p)))
                .min_by(|a, b| a.area.total_cmp(&b.area));
            if let Some(around) = around {
                pools.join(hole.of as u32, around.of as u32);
            }
        }
        // What is wholly under water and faces inward is a hollow of the pool that it lies in.
        let mut roots: Vec<usize> = sums.keys().copied().collect();
        roots.sort_unstable();
        let rimmed = |root: usize| loops.iter().any(|l| l.of == root);
        for &void in &roots {
            if sums[&void].volume >= 0.0 || rimmed(void) {
                continue;
            }
            let at = p(void as u32);
            let holder = roots.iter().copied().find(|&other| {
                other != void
                    && sums[&other].volume > 0.0
                    && winding(&walls[&other], &loops, other, &at, self, &apex) > 0.5
            });
            if let Some(holder) = holder {
                pools.join(void as u32, holder as u32);
            }
        }
        let mut together: HashMap<usize, Sums> = HashMap::new();
        for root in roots {
            let sum = together.entry(pools.root(root as u32)).or_default();
            sum.volume += sums[&root].volume;
            sum.first += sums[&root].first;
        }
        let least = 1e-12 * vessel.volume();
        let mut out: Vec<Pool> = together
            .values()
            .filter(|s| s.volume > least)
            .map(|s| Pool {
                volume: s.volume,
                centroid: s.first / s.volume + apex + vessel.middle,
            })
            .collect();
        out.sort_by(|a, b| {
            let by_volume = b.volume.total_cmp(&a.volume);
            by_volume.then_with(|| {
                let (a, b): ([f64; 3], [f64; 3]) = (a.centroid.into(), b.centroid.into());
                a.partial_cmp(&b).unwrap_or(std::cmp::Ordering::Equal)
            })
        });
        out
    }

    /// Two unit vectors in the level plane, right-handed with `up`.
    fn plane(&self) -> [Vector3<f64>; 2] {
        // The axis that `up` leans on least.
        let mut axis = Vector3::zeros();
        axis[self.up.iamin()] = 1.0;
        let u = self.up.cross(&axis).normalize();
        [u, self.up.cross(&u)]
    }

    /// The rim traced into closed loops. At an edge of several facets any continuation will do: it
    /// splits the rim into closed loops all the same.
    fn loops(
        &self,
        mut next: HashMap<(u32, u32), Vec<(u32, u32)>>,
        union: &mut Union,
        h: f64,
    ) -> Vec<Loop> {
        let [u, v] = self.plane();
        let mut starts: Vec<(u32, u32)> = next.keys().copied().collect();
        starts.sort_unstable();
        let mut out = Vec::new();
        for start in starts {
            while let Some(mut node) = next.get_mut(&start).and_then(Vec::pop) {
                let mut at = Vec::new();
                let mut push = |n: (u32, u32)| {
                    let p = self.crossing(n.0, n.1, h);
                    at.push([p.dot(&u), p.dot(&v)]);
                };
                push(start);
                while node != start {
                    push(node);
                    match next.get_mut(&node).and_then(Vec::pop) {
                        Some(on) => node = on,
                        // Only where the mesh is open.
                        None => break,
                    }
                }
                let area = at
                    .iter()
                    .zip(at.iter().cycle().skip(1))
                    .map(|(p, q)| (p[0] * q[1] - p[1] * q[0]) / 2.0)
                    .sum();
                out.push(Loop {
                    of: union.root(start.0),
                    at,
                    area,
                });
            }
        }
        out
    }
}

impl Loop {
    /// Whether a point of the plane lies inside, by the parity of crossings of a ray.
    fn holds(&self, p: [f64; 2]) -> bool {
        let sides = self.at.iter().zip(self.at.iter().cycle().skip(1));
        let crossings = sides.filter(|(a, b)| {
            (a[1] > p[1]) != (b[1] > p[1])
                && p[0] < a[0] + (b[0] - a[0]) * ((p[1] - a[1]) / (b[1] - a[1]))
        });
        crossings.count() % 2 == 1
    }
}

/// How often a piece's wall, closed by its free surface, winds around a point: the sum of solid
/// angles (Van Oosterom and Strackee 1983) over 4π.
fn winding(
    wall: &[[Vector3<f64>; 3]],
    loops: &[Loop],
    of: usize,
    at: &Vector3<f64>,
    levelled: &Levelled<'_>,
    apex: &Vector3<f64>,
) -> f64 {
    let angle = |t: &[Vector3<f64>; 3]| {
        let [a, b, c] = t.map(|p| p - at);
        let (x, y, z) = (a.norm(), b.norm(), c.norm());
        let below = x * y * z + a.dot(&b) * z + b.dot(&c) * x + c.dot(&a) * y;
        2.0 * a.dot(&b.cross(&c)).atan2(below)
    };
    let mut sum: f64 = wall.iter().map(angle).sum();
    let [u, v] = levelled.plane();
    for l in loops.iter().filter(|l| l.of == of) {
        let lift = |p: &[f64; 2]| u * p[0] + v * p[1] + apex;
        let sides = l.at.iter().zip(l.at.iter().cycle().skip(1));
        sum += sides
            .map(|(p, q)| angle(&[*apex, lift(p), lift(q)]))
            .sum::<f64>();
    }
    sum / (4.0 * std::f64::consts::PI)
}

/// Sets that grow together.
struct Union(Vec<u32>);

impl Union {
    fn new(n: usize) -> Self {
        Self((0..n as u32).collect())
    }

    fn root(&mut self, mut i: u32) -> usize {
        while self.0[i as usize] != i {
            let up = self.0[self.0[i as usize] as usize];
            self.0[i as usize] = up;
            i = up;
        }
        i as usize
    }

    fn join(&mut self, a: u32, b: u32) {
        let (a, b) = (self.root(a), self.root(b));
        // The smaller index leads, so that the order of facets does not show.
        self.0[a.max(b)] = a.min(b) as u32;
    }
}
