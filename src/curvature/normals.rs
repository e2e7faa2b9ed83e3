//! Normals of the surface at the nodes.
//!
//! They start from the facets around a node with the weights of Max ("Weights for computing vertex
//! normals from facet normals", J. Graphics Tools 4(2), 1999): sin α / (|e₁| |e₂|) for a corner of
//! angle α between edges e₁ and e₂. They are exact on spheres and on rows of long facets whatever
//! the spacing, where weights by area or angle lean towards the denser side.
//!
//! At the rim of a region half the neighbours are missing. There, and wherever the facets are
//! uneven, one more thing is known: on a surface without jumps of curvature the chord between two
//! points makes equal and opposite angles with the normals at its ends,
//!
//! ```text
//! (nᵢ + nⱼ)·(pⱼ − pᵢ) = O(h⁴) against nⱼ·(pⱼ − pᵢ) = O(h²)
//! ```
//!
//! so the normals are moved to meet it in the least-squares sense, short chords first. In a step
//! only those nodes move that gain more by it than their neighbours would (after Southwell's
//! relaxation): what is wrong at a few nodes is put right there, and not spread over the rest. What
//! the chords do not determine stays as it was at the start.

use nalgebra::Matrix3;

use super::surface::{NEXT, NONE, Surface, V};

// Chosen by measurement over the test bodies and the solids of `tests/outside/curved_solids.py`.
/// Steps of the iteration, at most.
const STEPS: usize = 40;
/// It ends where no normal moves by more than this angle.
const STILL: f64 = 1e-6;
/// A node moves all the way where it gains so many times as much as those it is tied to.
const CLEARLY: f64 = 1.4;
/// Weight of staying where it is, as a part of the chords' weight.
const STAY: f64 = 0.06;
/// Chords so many times longer than the shortest at both ends are past saying anything.
const LONG: f64 = 4.0;
/// Tilts up to this part of a short chord's may be no more than what the short chord's misjudge.
const SMALL: f64 = 0.8;

/// What is known of a node's normal.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Trust {
    /// It is estimated.
    Free,
    /// It is that of a plane, or square to a straight chord.
    Fixed,
    /// There is none: the tip of a cone.
    Singular,
}

/// Normals from the facets around each node.
pub(super) fn start(s: &Surface, nodes: &[[u32; 3]], count: usize) -> Vec<V> {
    let mut sum = vec![V::zeros(); count];
    let mut area = vec![V::zeros(); count];
    for (t, n) in nodes.iter().enumerate() {
        for k in 0..3 {
            let p = s.at(t, k);
            let (a, b) = (s.at(t, NEXT[k]) - p, s.at(t, NEXT[NEXT[k]]) - p);
            let lengths = a.norm_squared() * b.norm_squared();
            area[n[k] as usize] += s.normal[t] * s.area[t];
            if lengths > 0.0 {
                sum[n[k] as usize] += s.normal[t] * (2.0 * s.area[t] / lengths);
            }
        }
    }
    let unit = |v: &V| v.try_normalize(0.0);
    sum.iter()
        .zip(&area)
        .map(|(v, a)| unit(v).or_else(|| unit(a)).unwrap_or_else(V::zeros))
        .collect()
}

/// A chord between two nodes.
#[derive(Clone, Copy, Debug)]
pub(super) struct Edge {
    pub(super) ends: [u32; 2],
    length: f64,
    along: V,
    weight: f64,
    /// Whether it is no diagonal of a plane quadrangle.
    side: bool,
}

/// The chords of a surface, and the one that each half-edge runs along (one way or the other).
pub(super) fn edges(s: &Surface, smooth: &[bool], nodes: &[[u32; 3]]) -> (Vec<Edge>, Vec<u32>) {
    let mut out = Vec::with_capacity(smooth.len() / 2);
    let mut of = vec![0; smooth.len()];
    for h in 0..smooth.len() {
        let o = s.opposite[h];
        if smooth[h] && o < h as u32 {
            of[h] = of[o as usize];
            continue;
        }
        of[h] = out.len() as u32;
        let (t, k) = (h / 3, h % 3);
        let e = s.along(h);
        let length = e.norm();
        out.push(Edge {
            ends: [nodes[t][k], nodes[t][NEXT[k]]],
            length,
            along: if length > 0.0 { e / length } else { V::zeros() },
            weight: 0.0,
            side: !is_diagonal(s, h),
        });
    }
    weigh(
        &mut out,
        nodes.iter().flatten().max().map_or(0, |&n| n as usize + 1),
    );
    (out, of)
}

/// Gives each chord its weight: 1/l², and next to none where it is much longer than others at its
/// ends, since what is O(h⁴) for those is not for it.
fn weigh(edges: &mut [Edge], count: usize) {
    let mut least = vec![f64::INFINITY; count];
    for e in edges.iter().filter(|e| e.length > 0.0) {
        for i in e.ends {
            least[i as usize] = least[i as usize].min(e.length);
        }
    }
    for e in edges.iter_mut().filter(|e| e.length > 0.0) {
        let short = e.ends.map(|i| least[i as usize]);
        let longer = e.length / short[0].max(short[1]);
        e.weight = 1.0 / (e.length * e.length) / (1.0 + (longer / LONG).powi(6));
    }
}

/// Whether a half-edge is the diagonal of a plane quadrangle: coplanar facets on both sides, of
/// which it is the longest side.
fn is_diagonal(s: &Surface, h: usize) -> bool {
    let o = s.opposite[h];
    let longest = |h: usize| {
        let own = s.along(h).norm_squared();
        (0..3).all(|k| s.along(h - h % 3 + k).norm_squared() <= own)
    };
    o != NONE && s.turn[h].abs() <= s.level(h) && longest(h) && longest(o as usize)
}

/// How far a patch rises over a chord.
#[derive(Clone, Copy, Debug)]
pub(super) struct Rise {
    /// c of the side: four times the height in its middle.
    pub(super) value: f64,
    /// How far its ends differ on it.
    pub(super) off: f64,
}

/// The rise over each chord from the tilts of the normals at its ends.
pub(super) fn rises(edges: &[Edge], normals: &[V], trust: &[Trust]) -> Vec<Rise> {
    edges
        .iter()
        .map(|e| {
            let known = e.ends.map(|i| trust[i as usize] != Trust::Singular);
            let [a, b] = e.ends.map(|i| e.length * normals[i as usize].dot(&e.along));
            let (value, off) = match known {
                [true, true] => (limited(-a, b), (a + b).abs() / 2.0),
                [false, true] => (b, b.abs() / 2.0),
                [true, false] => (-a, a.abs() / 2.0),
                [false, false] => (0.0, 0.0),
            };
            if value.is_finite() && off.is_finite() {
                Rise { value, off }
            } else {
                Rise {
                    value: 0.0,
                    off: 0.0,
                }
            }
        })
        .collect()
}

/// The mean of what the two ends say of a chord's rise, but no more than twice the lesser of them,
/// and nothing where they say opposite things: where an edge that is meant fades out into a curve,
/// one end of a long chord stands on the kink, the other on straight ground. (The limiter of van
/// Leer, "Towards the ultimate conservative difference scheme IV", J. Comput. Phys. 23, 1977.)
fn limited(a: f64, b: f64) -> f64 {
    if a * b <= 0.0 {
        return 0.0;
    }
    let most = 2.0 * a.abs().min(b.abs());
    (a + b).abs().min(2.0 * most).copysign(a) / 2.0
}

/// Lays normals square to long chords along which the surface is straight.
///
/// Where a long chord ends among much shorter ones of its own direction, the surface may be
/// straight along it and curved beyond; what the normal there misjudges is small for the short
/// chords and large for the long one. A tilt that is small beside that of the short chords counts
/// as none. Diagonals of plane quadrangles have no say: surfaces are not straight along them.
pub(super) fn straighten(edges: &[Edge], normals: &mut [V], trust: &mut [Trust]) {
    let mut start = vec![0u32; normals.len() + 1];
    for e in edges {
        for i in e.ends {
            start[i as usize + 1] += 1;
        }
    }
    for i in 0..normals.len() {
        start[i + 1] += start[i];
    }
    let mut fill = start.clone();
    let mut list = vec![0u32; 2 * edges.len()];
    for (k, e) in edges.iter().enumerate() {
        for i in e.ends {
            list[fill[i as usize] as usize] = k as u32;
            fill[i as usize] += 1;
        }
    }
    for i in 0..normals.len() {
        if trust[i] != Trust::Free {
            continue;
        }
        let around = &list[start[i] as usize..start[i + 1] as usize];
        let mut n = normals[i];
        let mut full = false;
        for &k in around {
            let e = &edges[k as usize];
            if !e.side || e.length == 0.0 {
                continue;
            }
            let own = normals[i].dot(&e.along).abs();
            let mut small: f64 = 0.0;
            for &l in around {
                let f = &edges[l as usize];
                let longer = e.length / f.length;
                if longer > 1.5 && f.along.dot(&e.along).abs() > 0.6 {
                    let beside = own / normals[i].dot(&f.along).abs().max(1e-300);
                    let part = ((SMALL - beside) / 0.2).clamp(0.0, 1.0);
                    small = small.max(part * ((longer - 1.5) / 1.5).min(1.0));
                }
            }
            if small > 0.0 {
                n -= e.along * (n.dot(&e.along) * small);
                full |= small == 1.0;
            }
        }
        if full {
            trust[i] = Trust::Fixed;
        }
        if let Some(n) = n.try_normalize(0.0) {
            normals[i] = n;
        }
    }
}

/// Nodes at which the chords' angles disagree far more than around them: tips of cones.
pub(super) fn singular(edges: &[Edge], normals: &[V], trust: &mut [Trust]) {
    // The least disagreement among the chords of a node.
    let mut part = vec![f64::INFINITY; normals.len()];
    for e in edges.iter().filter(|e| e.length > 0.0) {
        let [a, b] = e.ends.map(|i| normals[i as usize].dot(&e.along));
        let size = a.abs() + b.abs();
        let off = if size > 1e-4 {
            (a + b).abs() / size
        } else {
            0.0
        };
        for i in e.ends {
            part[i as usize] = part[i as usize].min(off);
        }
    }
    for i in 0..trust.len() {
        if trust[i] == Trust::Free && part[i] > 0.5 && part[i] < f64::INFINITY {
            trust[i] = Trust::Singular;
        }
    }
}

/// Moves the free normals towards equal angles at both ends of every chord: steps of least squares
/// node by node, at those nodes that gain most by it.
pub(super) fn refine(edges: &[Edge], normals: &mut [V], trust: &[Trust]) {
    let known = |e: &&Edge| {
        e.side && e.length > 0.0 && e.ends.iter().all(|&i| trust[i as usize] != Trust::Singular)
    };
    let mut matrix = vec![[0.0f64; 6]; normals.len()];
    for e in edges.iter().filter(known) {
        let a = e.along;
        let w = e.weight;
        for i in e.ends {
            let m = &mut matrix[i as usize];
            for (x, y) in m.iter_mut().zip([
                a.x * a.x,
                a.y * a.y,
                a.z * a.z,
                a.x * a.y,
                a.x * a.z,
                a.y * a.z,
            ]) {
                *x += w * y;
            }
        }
    }
    for (m, n) in matrix.iter_mut().zip(&*normals) {
        let stay = STAY * (m[0] + m[1] + m[2]);
        let full = Matrix3::new(
            m[0] + stay,
            m[3],
            m[4],
            m[3],
            m[1] + stay,
            m[5],
            m[4],
            m[5],
            m[2] + stay,
        );
        // A normal only tilts: along itself it is held fast.
        let full = full + n * n.transpose() * (100.0 * (m[0] + m[1] + m[2]));
        let i = full.try_inverse().unwrap_or_else(Matrix3::zeros);
        *m = [i.m11, i.m22, i.m33, i.m12, i.m13, i.m23];
    }
    let n = normals.len();
    let (mut pull, mut step) = (vec![V::zeros(); n], vec![V::zeros(); n]);
    let [mut gain, mut rival, mut whole] = [(); 3].map(|()| vec![0.0f64; n]);
    for _ in 0..STEPS {
        pull.fill(V::zeros());
        for e in edges.iter().filter(known) {
            let [i, j] = e.ends.map(|i| i as usize);
            let v = e.along * (e.weight * (normals[i] + normals[j]).dot(&e.along));
            pull[i] += v;
            pull[j] += v;
        }
        for i in 0..n {
            let (m, p) = (&matrix[i], pull[i]);
            step[i] = V::new(
                m[0] * p.x + m[3] * p.y + m[4] * p.z,
                m[3] * p.x + m[1] * p.y + m[5] * p.z,
                m[4] * p.x + m[5] * p.y + m[2] * p.z,
            );
            gain[i] = if trust[i] == Trust::Free {
                step[i].dot(&p)
            } else {
                0.0
            };
        }
        rival.fill(0.0);
        whole.fill(0.0);
        for e in edges.iter().filter(known) {
            for i in e.ends {
                whole[i as usize] += e.weight * step[i as usize].dot(&e.along).powi(2);
            }
        }
        for e in edges.iter().filter(known) {
            let [i, j] = e.ends.map(|i| i as usize);
            for (i, j) in [(i, j), (j, i)] {
                let tie = e.weight * step[i].dot(&e.along).powi(2);
                if whole[i] > 0.0 {
                    rival[i] = rival[i].max(gain[j] * (4.0 * tie / whole[i]).min(1.0));
                }
            }
        }
        let mut most: f64 = 0.0;
        for i in 0..n {
            let part = if trust[i] != Trust::Free {
                continue;
            } else if gain[i] > CLEARLY * rival[i] {
                1.0
            } else if gain[i] * CLEARLY >= rival[i] {
                0.5
            } else {
                continue;
            };
            most = most.max(step[i].norm());
            if let Some(v) = (normals[i] - step[i] * part).try_normalize(0.0) {
                normals[i] = v;
            }
        }
        if most < STILL {
            break;
        }
    }
}
