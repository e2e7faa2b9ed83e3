//! Regions of a layer: closed contours on an integer grid, and what is done with them.
//!
//! Overlays are those of i_overlay on 64-bit integers: exact comparisons, new corners rounded to
//! the grid. The grid divides the part's extent by 2⁴⁰ or more, so that a corner moves by less
//! than 1e-12 of it.

use i_overlay::core::fill_rule::FillRule;
use i_overlay::core::overlay::{Overlay, ShapeType};
use i_overlay::core::overlay_rule::OverlayRule;
use i_overlay::i_float::int::point::IntPoint;
use i_overlay::i_shape::flat::buffer::FlatContoursBuffer;
use nalgebra::{Matrix3, Vector3};

use crate::geometry::eft::Sum;
use crate::moments::Moments;

/// A corner on the grid.
pub(super) type Corner = IntPoint<i64>;

/// Contours with the region to their left, outer ones anticlockwise and holes clockwise.
pub(super) type Region = FlatContoursBuffer<i64>;

/// Grid steps of half the part's extent: far within what the overlay takes, also where an inset
/// reaches beyond the part by its own width.
const HALF_EXTENT: f64 = (1_u64 << 40) as f64;

/// Where the grid lies in the plane of the layers.
#[derive(Clone, Copy, Debug)]
pub(super) struct Grid {
    middle: [f64; 2],
    /// Steps per length, a power of two, so that scaling rounds nothing.
    scale: f64,
}

impl Grid {
    /// The grid of a box, which must be finite and larger than a point.
    pub(super) fn over(low: [f64; 2], high: [f64; 2]) -> Self {
        let half = (0..2).map(|k| (high[k] - low[k]) / 2.0).fold(0.0, f64::max);
        let power = (HALF_EXTENT / half).log2().floor();
        Self {
            middle: [0, 1].map(|k| low[k] / 2.0 + high[k] / 2.0),
            scale: power.exp2(),
        }
    }

    /// The middle of the box that it lies over.
    pub(super) fn middle(&self) -> [f64; 2] {
        self.middle
    }

    pub(super) fn corner(&self, x: f64, y: f64) -> Corner {
        // Casts saturate; coordinates lie in the box that the grid was laid over.
        let step = |x: f64, m: f64| ((x - m) * self.scale).round() as i64;
        Corner::new(step(x, self.middle[0]), step(y, self.middle[1]))
    }

    /// A length in grid steps.
    pub(super) fn steps(&self, length: f64) -> f64 {
        length * self.scale
    }

    /// An area in the unit of lengths, from grid steps.
    fn length(&self, steps: f64) -> f64 {
        steps / self.scale
    }

    fn place(&self, c: Corner) -> [f64; 2] {
        [
            self.middle[0] + self.length(c.x as f64),
            self.middle[1] + self.length(c.y as f64),
        ]
    }
}

/// Integrals over a region about a corner of it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Flat {
    about: [f64; 2],
    pub(super) area: f64,
    first: [f64; 2],
    /// xx, yy, xy.
    second: [f64; 3],
}

impl Flat {
    const NONE: Self = Self {
        about: [0.0; 2],
        area: 0.0,
        first: [0.0; 2],
        second: [0.0; 3],
    };

    /// Exact integrals over polygons, by triangles from a common corner.
    pub(super) fn of(region: &Region, grid: &Grid) -> Self {
        let Some(&from) = region.points.first() else {
            return Self::NONE;
        };
        let mut sums = [Sum::ZERO; 6];
        // Differences of corners are below 2⁴², so that they are exact as doubles.
        let seen = |c: Corner| {
            [
                grid.length((c.x - from.x) as f64),
                grid.length((c.y - from.y) as f64),
            ]
        };
        for range in &region.ranges {
            let contour = &region.points[range.clone()];
            let Some(&last) = contour.last() else {
                continue;
            };
            let mut p = seen(last);
            for &c in contour {
                let q = seen(c);
                let d = p[0] * q[1] - p[1] * q[0];
                let terms = [
                    1.0 / 2.0,
                    (p[0] + q[0]) / 6.0,
                    (p[1] + q[1]) / 6.0,
                    (p[0] * p[0] + p[0] * q[0] + q[0] * q[0]) / 12.0,
                    (p[1] * p[1] + p[1] * q[1] + q[1] * q[1]) / 12.0,
                    (2.0 * (p[0] * p[1] + q[0] * q[1]) + p[0] * q[1] + q[0] * p[1]) / 24.0,
                ];
                for (sum, term) in sums.iter_mut().zip(terms) {
                    sum.add(d * term);
                }
                p = q;
            }
        }
        let v = sums.map(Sum::value);
        Self {
            about: grid.place(from),
            area: v[0],
            first: [v[1], v[2]],
            second: [v[3], v[4], v[5]],
        }
    }

    /// Moments of the region times a layer of the height `height` with its middle at `z`, in the
    /// print's frame.
    pub(super) fn slab(&self, z: f64, height: f64) -> Moments {
        let [xx, yy, xy] = self.second.map(|s| s * height);
        let zz = self.area * height * height * height / 12.0;
        Moments {
            about: Vector3::new(self.about[0], self.about[1], z),
            zeroth: self.area * height,
            first: Vector3::new(self.first[0], self.first[1], 0.0) * height,
            second: Matrix3::new(xx, xy, 0.0, xy, yy, 0.0, 0.0, 0.0, zz),
        }
    }
}

/// The overlays of one thread's layers; keeps its memory between them.
pub(super) struct Overlayer(Overlay<i64>);

impl Overlayer {
    pub(super) fn new() -> Self {
        Self(Overlay::new(0))
    }

    /// What the contours wind around at least once, anticlockwise counting as positive: touching,
    /// nested and crossing contours come out as one clean region.
    pub(super) fn wound(&mut self, contours: &Region) -> Region {
        self.0.clear();
        self.0.add_source(contours, ShapeType::Subject);
        self.run(OverlayRule::Subject)
    }

    /// The part of `a` that is in `b`.
    pub(super) fn common(&mut self, a: &Region, b: &Region) -> Region {
        if a.ranges.is_empty() || b.ranges.is_empty() {
            return Region::default();
        }
        if a == b {
            return a.clone();
        }
        self.0.clear();
        self.0.add_source(a, ShapeType::Subject);
        self.0.add_source(b, ShapeType::Clip);
        self.run(OverlayRule::Intersect)
    }

    /// The part of `a` that is in `b` and in `c`, in one overlay: `a` less all that lies outside
    /// either of them.
    pub(super) fn common_of_three(&mut self, a: &Region, b: &Region, c: &Region) -> Region {
        if b == c {
            return self.common(a, b);
        }
        if [a, b, c].iter().any(|r| r.ranges.is_empty()) {
            return Region::default();
        }
        self.0.clear();
        self.0.add_source(a, ShapeType::Subject);
        for region in [b, c] {
            self.0.add_contour(&FRAME, ShapeType::Clip);
            for range in &region.ranges {
                let back = region.points[range.clone()].iter().rev().copied();
                self.0.add_path_iter(back, ShapeType::Clip);
            }
        }
        self.run(OverlayRule::Difference)
    }

    fn run(&mut self, rule: OverlayRule) -> Region {
        let mut out = Region::default();
        self.0.overlay_into(rule, FillRule::Positive, &mut out);
        out.points.shrink_to_fit();
        out.ranges.shrink_to_fit();
        out
    }
}

/// A square around everything that lies on a grid.
const FRAME: [Corner; 4] = {
    const A: i64 = 1 << 42;
    [
        Corner { x: -A, y: -A },
        Corner { x: A, y: -A },
        Corner { x: A, y: A },
        Corner { x: -A, y: A },
    ]
};

/// Lower and upper corner of a region, in grid steps; `None` for an empty one.
pub(super) fn extent(region: &Region) -> Option<[f64; 2]> {
    let first = region.points.first()?;
    let (mut low, mut high) = (*first, *first);
    for p in &region.points {
        low = Corner::new(low.x.min(p.x), low.y.min(p.y));
        high = Corner::new(high.x.max(p.x), high.y.max(p.y));
    }
    Some([(high.x - low.x) as f64, (high.y - low.y) as f64])
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    pub(crate) fn region(contours: &[&[[f64; 2]]], grid: &Grid) -> Region {
        let mut out = Region::default();
        for contour in contours {
            let from = out.points.len();
            out.points
                .extend(contour.iter().map(|p| grid.corner(p[0], p[1])));
            out.ranges.push(from..out.points.len());
        }
        out
    }

    fn square(x: f64, y: f64, side: f64) -> [[f64; 2]; 4] {
        [[x, y], [x + side, y], [x + side, y + side], [x, y + side]]
    }

    const GRID: ([f64; 2], [f64; 2]) = ([-8.0, -8.0], [8.0, 8.0]);

    #[test]
    fn a_right_triangle_has_its_closed_form() {
        // Legs 3 and 4 (textbook): area 6, centre a third along each, ∫x² about the corner
        // a³b/12, ∫xy a²b²/24.
        let grid = Grid::over([0.0, 0.0], [4.0, 4.0]);
        let r = region(&[&[[0.0, 0.0], [3.0, 0.0], [0.0, 4.0]]], &grid);
        let f = Flat::of(&r, &grid);
        assert_eq!(f.area, 6.0);
        assert_eq!(f.first, [6.0, 8.0]);
        assert_eq!(f.second, [9.0, 16.0, 6.0]);
        let m = f.slab(1.0, 2.0);
        assert_eq!(m.zeroth, 12.0);
        assert_eq!(m.second[(2, 2)], 6.0 * 8.0 / 12.0);
    }

    #[test]
    fn touching_and_nested_contours_are_one_region() {
        let grid = Grid::over(GRID.0, GRID.1);
        let mut o = Overlayer::new();
        let area = |r: &Region| Flat::of(r, &grid).area;
        let back = |s: [[f64; 2]; 4]| [s[3], s[2], s[1], s[0]];
        // Two squares along an edge, and two at a corner.
        let along = region(&[&square(0.0, 0.0, 1.0), &square(1.0, 0.0, 1.0)], &grid);
        let along = o.wound(&along);
        assert_eq!((along.ranges.len(), area(&along)), (1, 2.0));
        let at_corner = region(&[&square(0.0, 0.0, 1.0), &square(1.0, 1.0, 1.0)], &grid);
        assert_eq!(area(&o.wound(&at_corner)), 2.0);
        // A hole that touches its outer contour, an island in it, a hole in that.
        let nested = region(
            &[
                &square(-4.0, -4.0, 8.0),
                &back(square(-4.0, -3.0, 6.0)),
                &square(-3.0, -2.0, 4.0),
                &back(square(-2.0, -1.0, 2.0)),
            ],
            &grid,
        );
        let nested = o.wound(&nested);
        assert_eq!(area(&nested), 64.0 - 36.0 + 16.0 - 4.0);
        // The same ground twice counts once.
        let twice = region(&[&square(0.0, 0.0, 2.0), &square(1.0, 1.0, 2.0)], &grid);
        assert_eq!(area(&o.wound(&twice)), 7.0);
    }

    proptest! {
        #[test]
        fn three_in_common_are_two_and_two(
            s in prop::array::uniform3((-6i8..3, -6i8..3, 1u8..5)),
        ) {
            let grid = Grid::over(GRID.0, GRID.1);
            let [a, b, c] = s.map(|(x, y, w)| {
                region(&[&square(f64::from(x), f64::from(y), f64::from(w))], &grid)
            });
            let mut o = Overlayer::new();
            let at_once = o.common_of_three(&a, &b, &c);
            let both = o.common(&a, &b);
            let in_steps = o.common(&both, &c);
            prop_assert_eq!(Flat::of(&at_once, &grid).area, Flat::of(&in_steps, &grid).area);
        }
    }
}
