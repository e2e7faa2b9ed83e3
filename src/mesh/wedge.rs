//! Pairing at busy edges: which triangles bound the same wedge of solid.

use crate::geometry::{Point, is_flat, plane_side, turn_2d};

/// A triangle at an edge: its apex, and whether it runs along the edge from low to high.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Leaf {
    pub(crate) apex: Point,
    pub(crate) forward: bool,
}

/// Pairs the leaves around the edge low → high, which run as often forward as backward, across
/// the wedges of solid between them. Returns pairs of indices.
///
/// Turning about low → high by the right-hand rule, a backward leaf has the solid ahead of it and
/// a forward one behind it. So each backward leaf opens a wedge that the next forward one closes;
/// where wedges overlap they nest like brackets. The order by angle is exact.
pub(crate) fn pair_across_solid(low: &Point, high: &Point, leaves: &[Leaf]) -> Vec<(usize, usize)> {
    // A facet whose corners lie on one line has no angle of its own: it cannot be what the others
    // are measured from, and goes where that one stands.
    let reference = leaves
        .iter()
        .map(|l| l.apex)
        .filter(|apex| !is_flat(&[*low, *high, *apex]))
        .min_by(places)
        .unwrap_or(leaves[0].apex);
    let mut order: Vec<usize> = (0..leaves.len()).collect();
    order.sort_by(|&i, &j| {
        compare_angle(low, high, &reference, &leaves[i].apex, &leaves[j].apex)
            // At one angle the wedge that ends is closed before the next opens.
            .then(leaves[j].forward.cmp(&leaves[i].forward))
            .then_with(|| {
                // Leaves that lie on each other: by place, so that the order of the file decides
                // nothing; the other way round where the edge is read the other way round.
                let by_place = places(&leaves[i].apex, &leaves[j].apex).then(i.cmp(&j));
                if places(low, high).is_lt() {
                    by_place
                } else {
                    by_place.reverse()
                }
            })
    });
    // Start where no bracket is open: just after the point of least balance.
    let mut balance = 0i64;
    let mut least = (0i64, 0usize);
    for (k, &i) in order.iter().enumerate() {
        balance += if leaves[i].forward { -1 } else { 1 };
        if balance < least.0 {
            least = (balance, k + 1);
        }
    }
    let mut open = Vec::new();
    let mut pairs = Vec::new();
    for k in 0..order.len() {
        let i = order[(least.1 + k) % order.len()];
        if leaves[i].forward {
            if let Some(j) = open.pop() {
                pairs.push((j, i));
            }
        } else {
            open.push(i);
        }
    }
    pairs
}

/// Points in a fixed order.
fn places(a: &Point, b: &Point) -> std::cmp::Ordering {
    let axes = a
        .iter()
        .zip(b)
        .map(|(x, y)| (x + 0.0).total_cmp(&(y + 0.0)));
    axes.fold(std::cmp::Ordering::Equal, std::cmp::Ordering::then)
}

/// Whether the half-plane of `p` about low → high lies strictly inside the wedge that is swept by
/// turning the half-plane of `from` ahead to that of `to`. A wedge of no angle, or of a whole
/// turn, holds none.
pub(crate) fn strictly_inside(
    low: &Point,
    high: &Point,
    from: &Point,
    to: &Point,
    p: &Point,
) -> bool {
    half(low, high, from, p) != 0
        && half(low, high, from, to) != 0
        && compare_angle(low, high, from, p, to).is_lt()
}

/// Compares the angles of two apexes about low → high, each counted from the reference apex.
fn compare_angle(low: &Point, high: &Point, r: &Point, a: &Point, b: &Point) -> std::cmp::Ordering {
    let (ha, hb) = (half(low, high, r, a), half(low, high, r, b));
    ha.cmp(&hb).then_with(|| {
        if ha % 2 == 0 {
            // Exactly on the reference half-plane or on its opposite: equal.
            return std::cmp::Ordering::Equal;
        }
        // a before b where b lies on the side that the half-plane of a turns towards.
        match plane_side(low, high, a, b) {
            1 => std::cmp::Ordering::Less,
            -1 => std::cmp::Ordering::Greater,
            _ => std::cmp::Ordering::Equal,
        }
    })
}

/// 0: on the reference half-plane; 1: less than half a turn ahead; 2: opposite; 3: more.
fn half(low: &Point, high: &Point, r: &Point, p: &Point) -> u8 {
    match plane_side(low, high, r, p) {
        1 => 1,
        -1 => 3,
        _ => {
            // Coplanar: the same side of the edge as the reference, or the other; seen in a
            // coordinate plane where the reference triangle has area.
            for (u, v) in [(0, 1), (1, 2), (2, 0)] {
                let s = turn_2d(low, high, r, u, v);
                if s != 0 {
                    return if turn_2d(low, high, p, u, v) == -s {
                        2
                    } else {
                        0
                    };
                }
            }
            0
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Leaves at given quarter turns about the z axis.
    fn leaf(quarter: usize, forward: bool) -> Leaf {
        let apex = [
            [1.0, 0.0, 0.5],
            [0.0, 1.0, 0.5],
            [-1.0, 0.0, 0.5],
            [0.0, -1.0, 0.5],
        ][quarter];
        Leaf { apex, forward }
    }

    #[test]
    fn two_cubes_along_an_edge_stay_apart() {
        // Solid from 0° to 90° and from 180° to 270°: backward opens, forward closes.
        let leaves = [leaf(2, false), leaf(1, true), leaf(3, true), leaf(0, false)];
        let mut pairs = pair_across_solid(&[0.0; 3], &[0.0, 0.0, 1.0], &leaves);
        pairs.sort_unstable();
        assert_eq!(pairs, [(0, 2), (3, 1)]);
    }

    #[test]
    fn a_facet_without_area_measures_no_angle() {
        // The two cubes again, with a sliver along the edge, passed both ways.
        let flat = |forward| Leaf {
            apex: [0.0, 0.0, 0.5],
            forward,
        };
        for first in [0, 4] {
            let mut leaves = vec![leaf(2, false), leaf(1, true), leaf(3, true), leaf(0, false)];
            leaves.insert(first, flat(true));
            leaves.insert(first, flat(false));
            let pairs = pair_across_solid(&[0.0; 3], &[0.0, 0.0, 1.0], &leaves);
            let quarter = |i: usize| leaves[i].apex;
            assert_eq!(pairs.len(), 3);
            // The cube that does not stand where angles are counted from keeps its two leaves.
            assert!(
                pairs.iter().any(|&(i, j)| {
                    (quarter(i), quarter(j)) == ([1.0, 0.0, 0.5], [0.0, 1.0, 0.5])
                })
            );
        }
    }

    #[test]
    fn a_half_plane_inside_a_wedge_is_told() {
        let (low, high) = ([0.0; 3], [0.0, 0.0, 1.0]);
        let at = |q: usize| leaf(q, true).apex;
        for (from, to, p, want) in [
            (0, 2, 1, true),
            (0, 2, 3, false),
            (2, 0, 3, true),
            (2, 0, 1, false),
            (0, 3, 2, true),
            (0, 1, 1, false),
            (0, 1, 0, false),
            (1, 1, 2, false),
        ] {
            let (from, to, p) = (at(from), at(to), at(p));
            assert_eq!(strictly_inside(&low, &high, &from, &to, &p), want);
        }
    }

    #[test]
    fn two_wedges_of_air_give_the_other_pairing() {
        // Solid from 90° to 180° and from 270° to 360°.
        let leaves = [leaf(0, true), leaf(1, false), leaf(2, true), leaf(3, false)];
        let mut pairs = pair_across_solid(&[0.0; 3], &[0.0, 0.0, 1.0], &leaves);
        pairs.sort_unstable();
        assert_eq!(pairs, [(1, 2), (3, 0)]);
    }
}
