//! A tree of boxes over triangles, and the pairs of triangles whose boxes meet.
//!
//! Triangles are sorted along a Morton curve through the middles of their boxes; runs of four are
//! leaves, and each level above joins neighbours in twos (a linear bounding-volume hierarchy after
//! Lauterbach et al., "Fast BVH construction on GPUs", Computer Graphics Forum 28(2), 2009). The
//! tree is complete, so that it is a few flat arrays: 4 bytes of order and 12 of boxes a triangle.
//! Boxes are f32, rounded outward: a pair is never missed.

use rayon::prelude::*;

use super::{Corners, Point, Select};

/// Triangles in a leaf.
const LEAF: usize = 4;
/// Nodes that parallel work starts from, at most.
const TASKS: usize = 4096;

#[derive(Clone, Copy, Debug)]
struct Aabb {
    low: [f32; 3],
    high: [f32; 3],
}

impl Aabb {
    const EMPTY: Self = Self {
        low: [f32::INFINITY; 3],
        high: [f32::NEG_INFINITY; 3],
    };

    fn of(t: &[Point; 3]) -> Self {
        let [a, b, c] = t;
        Self {
            low: [0, 1, 2].map(|k| down(a[k].min(b[k]).min(c[k]))),
            high: [0, 1, 2].map(|k| up(a[k].max(b[k]).max(c[k]))),
        }
    }

    fn joined(&self, o: &Self) -> Self {
        let mut out = *self;
        for k in 0..3 {
            out.low[k] = self.low[k].min(o.low[k]);
            out.high[k] = self.high[k].max(o.high[k]);
        }
        out
    }

    #[inline(always)]
    fn meets(&self, o: &Self) -> bool {
        // Without short cuts: six comparisons cost less than a branch that is guessed wrong.
        (self.low[0] <= o.high[0])
            & (o.low[0] <= self.high[0])
            & (self.low[1] <= o.high[1])
            & (o.low[1] <= self.high[1])
            & (self.low[2] <= o.high[2])
            & (o.low[2] <= self.high[2])
    }
}

impl Aabb {
    /// From a point to the box; less by a few roundings where it must not be more.
    #[inline(always)]
    fn squared_distance(&self, p: &Point) -> f64 {
        let mut sum = 0.0;
        for ((low, high), x) in self.low.iter().zip(&self.high).zip(p) {
            let d = (f64::from(*low) - x).max(x - f64::from(*high)).max(0.0);
            sum += d * d;
        }
        sum * (1.0 - 4.0 * f64::EPSILON)
    }
}

/// The largest f32 that is no more than x.
#[inline(always)]
fn down(x: f64) -> f32 {
    let y = x as f32;
    if f64::from(y) > x { y.next_down() } else { y }
}

/// The smallest f32 that is no less than x.
#[inline(always)]
fn up(x: f64) -> f32 {
    let y = x as f32;
    if f64::from(y) < x { y.next_up() } else { y }
}

/// A tree of boxes over chosen triangles. It holds numbers of triangles, not the triangles: the
/// same sequence must be handed to its queries.
#[derive(Clone, Debug)]
pub struct BoxTree {
    /// Triangles along the curve.
    order: Vec<u32>,
    /// Boxes of the nodes, leaves first, then each level above.
    boxes: Vec<Aabb>,
    /// Where each level starts in `boxes`, and how long it is.
    levels: Vec<(usize, usize)>,
}

/// A node: its level, 0 for leaves, and its place there.
#[derive(Clone, Copy)]
struct Node {
    level: usize,
    at: usize,
}

impl BoxTree {
    /// Over the chosen triangles, all with finite coordinates, of at most 2³² − 1.
    pub fn new(facets: &impl Corners, select: Select<'_>) -> Self {
        let n = select.len(facets.count());
        let order = morton_order(facets, select, n);
        let mut boxes: Vec<Aabb> = order
            .par_chunks(LEAF)
            .map(|run| {
                run.iter().fold(Aabb::EMPTY, |b, &t| {
                    b.joined(&Aabb::of(&facets.triangle(t as usize)))
                })
            })
            .collect();
        let mut levels = vec![(0, boxes.len())];
        while let Some(&(start, len)) = levels.last()
            && len > 1
        {
            let above: Vec<Aabb> = boxes[start..start + len]
                .chunks(2)
                .map(|pair| pair.iter().fold(Aabb::EMPTY, |b, x| b.joined(x)))
                .collect();
            levels.push((boxes.len(), above.len()));
            boxes.extend(above);
        }
        Self {
            order,
            boxes,
            levels,
        }
    }

    /// How many triangles it holds.
    pub fn len(&self) -> usize {
        self.order.len()
    }

    /// Whether it holds none.
    pub fn is_empty(&self) -> bool {
        self.order.is_empty()
    }

    fn of(&self, n: Node) -> &Aabb {
        &self.boxes[self.levels[n.level].0 + n.at]
    }

    fn children(&self, n: Node) -> impl Iterator<Item = Node> + use<> {
        let level = n.level - 1;
        let end = self.levels[level].1.min(2 * n.at + 2);
        (2 * n.at..end).map(move |at| Node { level, at })
    }

    fn leaf(&self, n: Node) -> &[u32] {
        &self.order[n.at * LEAF..self.order.len().min((n.at + 1) * LEAF)]
    }

    /// The highest level of at most `most` nodes.
    fn nodes(&self, most: usize) -> Vec<Node> {
        if self.is_empty() {
            return Vec::new();
        }
        let level = self
            .levels
            .iter()
            .position(|&(_, len)| len <= most)
            .unwrap_or(self.levels.len() - 1);
        (0..self.levels[level].1)
            .map(|at| Node { level, at })
            .collect()
    }

    /// Visits, in parallel, each pair of different triangles whose boxes meet, once: `visit(found,
    /// t, u, corners of t, corners of u)`, with t < u. Returns what the parts of the work gathered,
    /// in an order that does not depend on the number of threads.
    pub fn pairs_within<A: Default + Send>(
        &self,
        facets: &impl Corners,
        visit: impl Fn(&mut A, u32, u32, &[Point; 3], &[Point; 3]) + Sync,
    ) -> Vec<A> {
        let nodes = self.nodes(TASKS);
        (0..nodes.len())
            .into_par_iter()
            .map(|i| {
                let mut found = A::default();
                self.inside(facets, nodes[i], &visit, &mut found);
                for &other in &nodes[i + 1..] {
                    if self.of(nodes[i]).meets(self.of(other)) {
                        self.between(facets, nodes[i], other, &visit, &mut found);
                    }
                }
                found
            })
            .collect()
    }

    /// Visits triangles near a point, near ones first, as long as they may be within a squared
    /// distance: `visit(t, corners)` returns the bound for the triangles after it.
    pub fn near(
        &self,
        facets: &impl Corners,
        point: &Point,
        mut bound: f64,
        mut visit: impl FnMut(u32, &[Point; 3]) -> f64,
    ) {
        let Some(&(_, 1)) = self.levels.last() else {
            return;
        };
        let root = Node {
            level: self.levels.len() - 1,
            at: 0,
        };
        // Each level leaves at most one node waiting.
        let mut waiting = Vec::with_capacity(self.levels.len());
        waiting.push((self.of(root).squared_distance(point), root));
        while let Some((distance, node)) = waiting.pop() {
            if distance > bound {
                continue;
            }
            if node.level == 0 {
                for &t in self.leaf(node) {
                    bound = visit(t, &facets.triangle(t as usize));
                }
                continue;
            }
            let from = waiting.len();
            for child in self.children(node) {
                let d = self.of(child).squared_distance(point);
                if d <= bound {
                    waiting.push((d, child));
                }
            }
            // The nearer child is taken next.
            if waiting.len() == from + 2 && waiting[from].0 < waiting[from + 1].0 {
                waiting.swap(from, from + 1);
            }
        }
    }

    fn inside<A>(
        &self,
        facets: &impl Corners,
        node: Node,
        visit: &impl Fn(&mut A, u32, u32, &[Point; 3], &[Point; 3]),
        found: &mut A,
    ) {
        if node.level == 0 {
            let run = self.leaf(node);
            let mut loaded = Loaded::default();
            loaded.fill(run, facets, &Aabb::of_everything());
            for i in 0..loaded.len {
                for j in i + 1..loaded.len {
                    loaded.pair(&loaded, i, j, visit, found);
                }
            }
            return;
        }
        let mut children = self.children(node);
        let (first, second) = (children.next(), children.next());
        for child in [first, second].into_iter().flatten() {
            self.inside(facets, child, visit, found);
        }
        if let (Some(a), Some(b)) = (first, second)
            && self.of(a).meets(self.of(b))
        {
            self.between(facets, a, b, visit, found);
        }
    }

    fn between<A>(
        &self,
        facets: &impl Corners,
        a: Node,
        b: Node,
        visit: &impl Fn(&mut A, u32, u32, &[Point; 3], &[Point; 3]),
        found: &mut A,
    ) {
        if a.level == 0 {
            let (mut of_a, mut of_b) = (Loaded::default(), Loaded::default());
            of_a.fill(self.leaf(a), facets, self.of(b));
            if of_a.len == 0 {
                return;
            }
            of_b.fill(self.leaf(b), facets, self.of(a));
            for i in 0..of_a.len {
                for j in 0..of_b.len {
                    of_a.pair(&of_b, i, j, visit, found);
                }
            }
            return;
        }
        // Both are of one level, and so are their children.
        for x in self.children(a) {
            for y in self.children(b) {
                if self.of(x).meets(self.of(y)) {
                    self.between(facets, x, y, visit, found);
                }
            }
        }
    }

    /// Visits, in parallel, the pairs of a triangle of this tree and one of another's whose boxes
    /// meet: `visit(found, t of this, u of the other, …)`. Returns as [`BoxTree::pairs_within`].
    pub fn pairs_with<A: Default + Send>(
        &self,
        facets: &impl Corners,
        other: &Self,
        others: &impl Corners,
        visit: impl Fn(&mut A, u32, u32, &[Point; 3], &[Point; 3]) + Sync,
    ) -> Vec<A> {
        let (mine, theirs) = (self.nodes(TASKS), other.nodes(1));
        mine.into_par_iter()
            .map(|a| {
                let mut found = A::default();
                for &b in &theirs {
                    self.against(facets, a, other, others, b, &visit, &mut found);
                }
                found
            })
            .collect()
    }

    #[allow(clippy::too_many_arguments)]
    fn against<A>(
        &self,
        facets: &impl Corners,
        a: Node,
        other: &Self,
        others: &impl Corners,
        b: Node,
        visit: &impl Fn(&mut A, u32, u32, &[Point; 3], &[Point; 3]),
        found: &mut A,
    ) {
        if !self.of(a).meets(other.of(b)) {
            return;
        }
        if a.level == 0 && b.level == 0 {
            let (mut of_a, mut of_b) = (Loaded::default(), Loaded::default());
            of_a.fill(self.leaf(a), facets, other.of(b));
            of_b.fill(other.leaf(b), others, self.of(a));
            for i in 0..of_a.len {
                for j in 0..of_b.len {
                    if of_a.boxes[i].meets(&of_b.boxes[j]) {
                        visit(
                            found,
                            of_a.which[i],
                            of_b.which[j],
                            &of_a.corners[i],
                            &of_b.corners[j],
                        );
                    }
                }
            }
        } else if a.level >= b.level {
            for child in self.children(a) {
                self.against(facets, child, other, others, b, visit, found);
            }
        } else {
            for child in other.children(b) {
                self.against(facets, a, other, others, child, visit, found);
            }
        }
    }
}

impl Aabb {
    fn of_everything() -> Self {
        Self {
            low: [f32::NEG_INFINITY; 3],
            high: [f32::INFINITY; 3],
        }
    }
}

/// The triangles of a leaf that meet a box.
#[derive(Default)]
struct Loaded {
    len: usize,
    which: [u32; LEAF],
    corners: [[Point; 3]; LEAF],
    boxes: [Aabb; LEAF],
}

impl Default for Aabb {
    fn default() -> Self {
        Self::EMPTY
    }
}

impl Loaded {
    #[inline(always)]
    fn fill(&mut self, run: &[u32], facets: &impl Corners, near: &Aabb) {
        for &t in run {
            let corners = facets.triangle(t as usize);
            let bounds = Aabb::of(&corners);
            if bounds.meets(near) {
                let at = self.len;
                self.which[at] = t;
                self.corners[at] = corners;
                self.boxes[at] = bounds;
                self.len += 1;
            }
        }
    }

    #[inline(always)]
    fn pair<A>(
        &self,
        other: &Self,
        i: usize,
        j: usize,
        visit: &impl Fn(&mut A, u32, u32, &[Point; 3], &[Point; 3]),
        found: &mut A,
    ) {
        if !self.boxes[i].meets(&other.boxes[j]) {
            return;
        }
        let (t, u) = (self.which[i], other.which[j]);
        if t < u {
            visit(found, t, u, &self.corners[i], &other.corners[j]);
        } else {
            visit(found, u, t, &other.corners[j], &self.corners[i]);
        }
    }
}

/// The chosen triangles along a Morton curve through the middles of their boxes; those of one cell
/// in file order.
fn morton_order(facets: &impl Corners, select: Select<'_>, n: usize) -> Vec<u32> {
    let middle = |i: usize| {
        let t = facets.triangle(select.get(i));
        // Halves first, so that nothing overflows.
        [0, 1, 2].map(|k| {
            t[0][k].min(t[1][k]).min(t[2][k]) / 2.0 + t[0][k].max(t[1][k]).max(t[2][k]) / 2.0
        })
    };
    const NONE: [[f64; 3]; 2] = [[f64::INFINITY; 3], [f64::NEG_INFINITY; 3]];
    // Smallest and largest are the same in any grouping.
    let [low, high] = (0..n)
        .into_par_iter()
        .with_min_len(4096)
        .fold(
            || NONE,
            |[low, high], i| {
                let m = middle(i);
                [
                    [0, 1, 2].map(|k| low[k].min(m[k])),
                    [0, 1, 2].map(|k| high[k].max(m[k])),
                ]
            },
        )
        .reduce(
            || NONE,
            |a, b| {
                [
                    [0, 1, 2].map(|k| a[0][k].min(b[0][k])),
                    [0, 1, 2].map(|k| a[1][k].max(b[1][k])),
                ]
            },
        );
    // One scale for all axes keeps the cells cubes.
    let width = (0..3).map(|k| high[k] - low[k]).fold(0.0, f64::max);
    let scale = 2_097_151.0 / width;
    let scale = if scale.is_finite() { scale } else { 0.0 };
    let mut keyed: Vec<(u64, u32)> = (0..n)
        .into_par_iter()
        .with_min_len(4096)
        .map(|i| {
            let m = middle(i);
            // The cast saturates, also for NaN.
            let cell = [0, 1, 2].map(|k| spread(((m[k] - low[k]) * scale) as u64 & 0x1f_ffff));
            (cell[0] | cell[1] << 1 | cell[2] << 2, select.get(i) as u32)
        })
        .collect();
    keyed.par_sort_unstable();
    keyed.into_par_iter().map(|(_, t)| t).collect()
}

/// The 21 low bits, two zeros between each.
fn spread(x: u64) -> u64 {
    let x = (x | x << 32) & 0x001f_0000_0000_ffff;
    let x = (x | x << 16) & 0x001f_0000_ff00_00ff;
    let x = (x | x << 8) & 0x100f_00f0_0f00_f00f;
    let x = (x | x << 4) & 0x10c3_0c30_c30c_30c3;
    (x | x << 2) & 0x1249_2492_4924_9249
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::LooseFacets;
    use proptest::prelude::*;

    fn boxes_meet(t: &[Point; 3], u: &[Point; 3]) -> bool {
        let end = |t: &[Point; 3], k: usize, pick: fn(f64, f64) -> f64| {
            pick(pick(t[0][k], t[1][k]), t[2][k])
        };
        (0..3).all(|k| {
            end(t, k, f64::min) <= end(u, k, f64::max) && end(u, k, f64::min) <= end(t, k, f64::max)
        })
    }

    fn triangles() -> impl Strategy<Value = Vec<[Point; 3]>> {
        prop::collection::vec(
            (
                prop::array::uniform3(-50i8..50),
                prop::array::uniform9(-6i8..=6),
            )
                .prop_map(|(m, v)| {
                    [0, 3, 6]
                        .map(|k| [0, 1, 2].map(|i| f64::from(m[i]) + f64::from(v[k + i]) * 0.7))
                }),
            0..300,
        )
    }

    proptest! {
        #[test]
        fn every_pair_of_boxes_that_meet_is_visited_once(list in triangles(), other in triangles()) {
            let gather = |found: &mut Vec<(u32, u32)>, t, u, _: &[Point; 3], _: &[Point; 3]| {
                found.push((t, u));
            };
            let facets = LooseFacets(&list);
            let tree = BoxTree::new(&facets, Select::All);
            let mut got = tree.pairs_within(&facets, gather).concat();
            got.sort_unstable();
            prop_assert!(got.windows(2).all(|w| w[0] != w[1]));
            // f32 boxes may meet where the triangles' do not: only those that do must be there.
            for i in 0..list.len() {
                for j in i + 1..list.len() {
                    if boxes_meet(&list[i], &list[j]) {
                        prop_assert!(got.binary_search(&(i as u32, j as u32)).is_ok());
                    }
                }
            }
            let others = LooseFacets(&other);
            let second = BoxTree::new(&others, Select::All);
            let mut got = tree.pairs_with(&facets, &second, &others, gather).concat();
            got.sort_unstable();
            prop_assert!(got.windows(2).all(|w| w[0] != w[1]));
            for (i, t) in list.iter().enumerate() {
                for (j, u) in other.iter().enumerate() {
                    if boxes_meet(t, u) {
                        prop_assert!(got.binary_search(&(i as u32, j as u32)).is_ok());
                    }
                }
            }
        }
    }

    #[test]
    fn the_bits_of_a_cell_are_spread_by_threes() {
        assert_eq!(spread(0x1f_ffff), 0x1249_2492_4924_9249);
        for bit in 0..21 {
            assert_eq!(spread(1 << bit), 1u64 << (3 * bit));
        }
    }
}
