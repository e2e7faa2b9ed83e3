//! An outline in mass and station that the centre must stay in.

use robust::{Coord, orient2d};

use super::measured::Axis;

/// The most corners of an outline.
const MOST: usize = 1000;

/// A simple polygon in (mass, station).
#[derive(Clone, Debug, PartialEq)]
pub struct Envelope {
    /// Datum and direction of stations.
    pub axis: Axis,
    outline: Vec<[f64; 2]>,
}

impl Envelope {
    /// An outline of corners (mass in kg, station in m), in order either way round.
    ///
    /// # Errors
    /// What is wrong with the outline, in words: fewer than three corners, more than 1000, two in
    /// one place, sides that cross or touch, or no area.
    pub fn new(axis: Axis, outline: Vec<[f64; 2]>) -> Result<Self, String> {
        let n = outline.len();
        if n < 3 {
            return Err(format!("an outline of {n} corners encloses nothing"));
        }
        if n > MOST {
            return Err(format!("an outline of {n} corners, more than {MOST}"));
        }
        if let Some(k) = outline
            .iter()
            .position(|p| !p.iter().all(|x| x.is_finite()) || p[0] < 0.0)
        {
            return Err(format!(
                "corner {} of the outline is no mass and station",
                k + 1
            ));
        }
        for i in 0..n {
            for j in i + 1..n {
                if outline[i] == outline[j] {
                    return Err(format!(
                        "corners {} and {} of the outline are in one place",
                        i + 1,
                        j + 1
                    ));
                }
            }
        }
        let at = |i: usize| outline[i % n];
        for i in 0..n {
            // Neighbours share a corner: they may not fold back onto each other.
            if turn(at(i), at(i + 1), at(i + 2)) == 0.0 && between(at(i), at(i + 1), at(i + 2)) {
                return Err(format!(
                    "the outline folds back at corner {}",
                    (i + 1) % n + 1
                ));
            }
            for j in i + 2..n {
                if (j + 1) % n != i && meet(at(i), at(i + 1), at(j), at(j + 1)) {
                    return Err(format!(
                        "side {} of the outline meets side {}",
                        i + 1,
                        j + 1
                    ));
                }
            }
        }
        // A triangle in one line is the only flat outline that is left.
        if n == 3 && turn(at(0), at(1), at(2)) == 0.0 {
            return Err("the outline has no area".into());
        }
        Ok(Self { axis, outline })
    }

    /// The corners, (mass in kg, station in m).
    pub fn outline(&self) -> &[[f64; 2]] {
        &self.outline
    }

    /// The least and the greatest mass of the outline, kg.
    pub fn masses(&self) -> (f64, f64) {
        let masses = self.outline.iter().map(|p| p[0]);
        (
            masses.clone().fold(f64::INFINITY, f64::min),
            masses.fold(0.0, f64::max),
        )
    }

    /// The band of stations at a mass that `station` lies in, or lies nearest to; outside of the
    /// outline's masses that at the nearest mass. With each end, how it moves with the mass, m/kg
    /// (of the side on the inner side of a corner's mass).
    pub fn band(&self, mass: f64, station: f64) -> [(f64, f64); 2] {
        let (lo, hi) = self.masses();
        let outside = mass <= lo || mass >= hi;
        let mass = mass.clamp(lo, hi);
        // Half-open sides count each corner once; at the heaviest mass from below.
        let top = mass >= hi;
        let n = self.outline.len();
        let mut cuts: Vec<(f64, f64)> = Vec::new();
        for i in 0..n {
            let (p, q) = (self.outline[i], self.outline[(i + 1) % n]);
            let (p, q) = if p[0] <= q[0] { (p, q) } else { (q, p) };
            let inside = if top {
                p[0] < mass && mass <= q[0]
            } else {
                p[0] <= mass && mass < q[0]
            };
            if inside {
                let slope = (q[1] - p[1]) / (q[0] - p[0]);
                cuts.push((
                    p[1] + (mass - p[0]) * slope,
                    if outside { 0.0 } else { slope },
                ));
            }
        }
        cuts.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut best = [(f64::INFINITY, 0.0), (f64::NEG_INFINITY, 0.0)];
        let mut least = f64::INFINITY;
        for pair in cuts.chunks_exact(2) {
            let away = (pair[0].0 - station).max(station - pair[1].0);
            if away < least {
                least = away;
                best = [pair[0], pair[1]];
            }
        }
        best
    }

    /// Whether a straight line between two points inside stays inside.
    pub fn is_convex(&self) -> bool {
        let n = self.outline.len();
        let turns = (0..n).map(|i| {
            turn(
                self.outline[i],
                self.outline[(i + 1) % n],
                self.outline[(i + 2) % n],
            )
        });
        let (mut left, mut right) = (false, false);
        for t in turns {
            left |= t > 0.0;
            right |= t < 0.0;
        }
        !(left && right)
    }
}

fn turn(a: [f64; 2], b: [f64; 2], c: [f64; 2]) -> f64 {
    let coord = |p: [f64; 2]| Coord { x: p[0], y: p[1] };
    orient2d(coord(a), coord(b), coord(c))
}

/// Whether `c`, in line with a and b, lies on the side of b that a is on.
fn between(a: [f64; 2], b: [f64; 2], c: [f64; 2]) -> bool {
    (a[0] - b[0]) * (c[0] - b[0]) + (a[1] - b[1]) * (c[1] - b[1]) > 0.0
}

/// Whether two closed segments have a point in common.
fn meet(a: [f64; 2], b: [f64; 2], c: [f64; 2], d: [f64; 2]) -> bool {
    let (p, q) = (turn(a, b, c), turn(a, b, d));
    let (r, s) = (turn(c, d, a), turn(c, d, b));
    let apart = |x: f64, y: f64| (x > 0.0 && y > 0.0) || (x < 0.0 && y < 0.0);
    if apart(p, q) || apart(r, s) {
        return false;
    }
    if p == 0.0 && q == 0.0 {
        // In one line: they meet where their boxes do.
        return (0..2)
            .all(|k| a[k].min(b[k]) <= c[k].max(d[k]) && c[k].min(d[k]) <= a[k].max(b[k]));
    }
    true
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::Vector3;

    fn axis() -> Axis {
        Axis {
            at: Vector3::zeros(),
            along: Vector3::x(),
        }
    }

    #[test]
    fn bands_by_hand() {
        // A forward limit that moves aft as it gets heavier.
        let e = Envelope::new(
            axis(),
            vec![[100.0, 1.0], [200.0, 2.0], [200.0, 3.0], [100.0, 3.0]],
        )
        .unwrap();
        assert_eq!(e.masses(), (100.0, 200.0));
        assert_eq!(e.band(150.0, 1.0), [(1.5, 0.01), (3.0, 0.0)]);
        assert_eq!(e.band(200.0, 1.0), [(2.0, 0.0), (3.0, 0.0)]);
        assert_eq!(e.band(90.0, 1.0), [(1.0, 0.0), (3.0, 0.0)]);
        assert!(e.is_convex());
    }

    #[test]
    fn two_bands_at_one_mass() {
        // A U lying on its side: at 150 two bands; the nearest counts.
        let e = Envelope::new(
            axis(),
            vec![
                [100.0, 0.0],
                [200.0, 0.0],
                [200.0, 1.0],
                [120.0, 1.0],
                [120.0, 2.0],
                [200.0, 2.0],
                [200.0, 3.0],
                [100.0, 3.0],
            ],
        )
        .unwrap();
        assert_eq!(e.band(150.0, 1.2).map(|b| b.0), [0.0, 1.0]);
        assert_eq!(e.band(150.0, 1.8).map(|b| b.0), [2.0, 3.0]);
        assert_eq!(e.band(110.0, 1.5).map(|b| b.0), [0.0, 3.0]);
        assert!(!e.is_convex());
    }

    #[test]
    fn outlines_that_are_none() {
        let bad = |o: &[[f64; 2]]| Envelope::new(axis(), o.to_vec()).unwrap_err();
        assert!(bad(&[[1.0, 0.0], [2.0, 0.0]]).contains("2 corners"));
        assert!(bad(&[[0.0, 0.0], [1.0, 1.0], [1.0, 0.0], [0.0, 1.0]]).contains("meets"));
        assert!(bad(&[[0.0, 0.0], [1.0, 0.0], [0.0, 0.0], [0.0, 1.0]]).contains("one place"));
        assert!(bad(&[[0.0, 0.0], [1.0, 1.0], [2.0, 2.0]]).contains("fold"));
        assert!(bad(&[[0.0, 0.0], [2.0, 0.0], [1.0, 0.0], [0.0, 1.0]]).contains("fold"));
        assert!(bad(&[[-1.0, 0.0], [2.0, 0.0], [1.0, 1.0]]).contains("corner 1"));
        // A corner that touches another side.
        assert!(
            bad(&[[0.0, 0.0], [2.0, 0.0], [2.0, 2.0], [1.0, 0.0], [0.0, 2.0]]).contains("meets")
        );
    }
}
