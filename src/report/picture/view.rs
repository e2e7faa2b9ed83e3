//! One view: a direction to look in, a place on the sheet, and what hides what.

use crate::geometry::Corners;
use crate::mesh::{Mesh, each};

/// Which way one looks, along the file's axes.
#[derive(Clone, Copy, Debug)]
pub(super) struct Direction {
    pub(super) name: &'static str,
    /// Axes to the right, up, and away from the eye, each with its sign.
    pub(super) axes: [(usize, f64); 3],
}

pub(super) const DIRECTIONS: [Direction; 3] = [
    Direction {
        name: "from above, looking along −z",
        axes: [(0, 1.0), (1, 1.0), (2, -1.0)],
    },
    Direction {
        name: "from the front, looking along +y",
        axes: [(0, 1.0), (2, 1.0), (1, 1.0)],
    },
    Direction {
        name: "from the right, looking along −x",
        axes: [(1, 1.0), (2, 1.0), (0, -1.0)],
    },
];

/// A view on the sheet.
pub(super) struct View {
    pub(super) direction: Direction,
    /// Middle of the view on the sheet.
    pub(super) centre: [f64; 2],
    /// The point of the mesh that stands there.
    middle: [f64; 3],
    /// Sheet units a length unit.
    pub(super) scale: f64,
    /// Half width and height of what is drawn.
    pub(super) half: [f64; 2],
    width: usize,
    height: usize,
    depth: Vec<f32>,
}

impl View {
    pub(super) fn new(
        direction: Direction,
        centre: [f64; 2],
        scale: f64,
        bounds: &[[f64; 3]; 2],
        mesh: &Mesh,
    ) -> Self {
        let middle = [0, 1, 2].map(|k| bounds[0][k] + (bounds[1][k] - bounds[0][k]) / 2.0);
        let half = [0, 1].map(|i| {
            let k = direction.axes[i].0;
            (bounds[1][k] - bounds[0][k]) / 2.0 * scale
        });
        // The sheet is bounded, and so is this.
        let size = |h: f64| (2.0 * h).ceil() as usize + 5;
        let (width, height) = (size(half[0]), size(half[1]));
        let mut view = Self {
            direction,
            centre,
            middle,
            scale,
            half,
            width,
            height,
            depth: vec![f32::INFINITY; width * height],
        };
        each!(&mesh.soup.triangles, f => {
            for t in 0..f.count() {
                view.hide_behind(&f.triangle(t));
            }
        });
        view
    }

    /// Place on the sheet, and depth away from the eye, in sheet units.
    pub(super) fn see(&self, p: &[f64; 3]) -> [f64; 3] {
        let [r, u, d] = self
            .direction
            .axes
            .map(|(k, sign)| sign * (p[k] - self.middle[k]) * self.scale);
        [self.centre[0] + r, self.centre[1] - u, d]
    }

    /// Whether a facet with this normal faces the eye.
    pub(super) fn faces(&self, normal: &[f64; 3]) -> bool {
        let (k, sign) = self.direction.axes[2];
        sign * normal[k] < 0.0
    }

    fn cell(&self, x: f64, y: f64) -> (f64, f64) {
        (
            x - self.centre[0] + self.half[0] + 2.0,
            y - self.centre[1] + self.half[1] + 2.0,
        )
    }

    fn hide_behind(&mut self, t: &[[f64; 3]; 3]) {
        let p = t.map(|p| self.see(&p)).map(|[x, y, d]| {
            let (x, y) = self.cell(x, y);
            [x, y, d]
        });
        let span = |k: usize, most: usize| {
            let (low, high) = (
                p[0][k].min(p[1][k]).min(p[2][k]),
                p[0][k].max(p[1][k]).max(p[2][k]),
            );
            let cell = |x: f64| (x.max(0.0) as usize).min(most - 1);
            (cell((low - 0.5).ceil()), cell((high - 0.5).floor()))
        };
        let ((x0, x1), (y0, y1)) = (span(0, self.width), span(1, self.height));
        let area =
            (p[1][0] - p[0][0]) * (p[2][1] - p[0][1]) - (p[1][1] - p[0][1]) * (p[2][0] - p[0][0]);
        if area == 0.0 || !area.is_finite() {
            return;
        }
        for y in y0..=y1 {
            for x in x0..=x1 {
                let (cx, cy) = (x as f64 + 0.5, y as f64 + 0.5);
                let w = |a: &[f64; 3], b: &[f64; 3]| {
                    ((b[0] - a[0]) * (cy - a[1]) - (b[1] - a[1]) * (cx - a[0])) / area
                };
                let (w2, w0, w1) = (w(&p[0], &p[1]), w(&p[1], &p[2]), w(&p[2], &p[0]));
                if w0 >= 0.0 && w1 >= 0.0 && w2 >= 0.0 {
                    let d = (w0 * p[0][2] + w1 * p[1][2] + w2 * p[2][2]) as f32;
                    let cell = &mut self.depth[y * self.width + x];
                    *cell = cell.min(d);
                }
            }
        }
    }

    /// Whether a point (as [`View::see`] gives it) can be seen: nothing in any of the cells about
    /// it is nearer by more than a line's width.
    pub(super) fn shows(&self, p: &[f64; 3]) -> bool {
        let (x, y) = self.cell(p[0], p[1]);
        let (x, y) = (x.floor() as i64, y.floor() as i64);
        let mut farthest = f32::NEG_INFINITY;
        for dy in -1..=1 {
            for dx in -1..=1 {
                let (i, j) = (x + dx, y + dy);
                let inside =
                    i >= 0 && j >= 0 && (i as usize) < self.width && (j as usize) < self.height;
                let d = if inside {
                    self.depth[j as usize * self.width + i as usize]
                } else {
                    f32::INFINITY
                };
                farthest = farthest.max(d);
            }
        }
        p[2] <= f64::from(farthest) + 1.5
    }

    /// The rows of cells that the mesh covers: left, right and top of each on the sheet.
    pub(super) fn covered(&self) -> Vec<[f64; 3]> {
        let mut out = Vec::new();
        for y in 0..self.height {
            let row = &self.depth[y * self.width..(y + 1) * self.width];
            let mut x = 0;
            for part in row.chunk_by(|a, b| a.is_finite() == b.is_finite()) {
                if part[0].is_finite() {
                    let left = self.centre[0] - self.half[0] - 2.0 + x as f64;
                    let top = self.centre[1] - self.half[1] - 2.0 + y as f64;
                    out.push([left, left + part.len() as f64, top]);
                }
                x += part.len();
            }
        }
        out
    }
}
