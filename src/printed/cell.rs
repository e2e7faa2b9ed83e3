//! Cubes cut by half-spaces.

use nalgebra::Vector3;

use crate::moments::Moments;

/// Where `inward`·x ≥ `from`.
#[derive(Clone, Copy, Debug)]
pub(super) struct HalfSpace {
    pub(super) inward: Vector3<f64>,
    pub(super) from: f64,
}

impl HalfSpace {
    pub(super) fn over(&self, x: &Vector3<f64>) -> f64 {
        self.inward.dot(x) - self.from
    }
}

type Tetrahedron = [Vector3<f64>; 4];

/// Moments of the cube's part that lies in all half-spaces, about its middle.
pub(super) fn cut(middle: &Vector3<f64>, half: f64, spaces: &[HalfSpace]) -> Moments {
    let mut out = Moments::zero(*middle);
    // Seen from the middle, so that nothing far away costs digits.
    let near: Vec<HalfSpace> = spaces
        .iter()
        .map(|s| HalfSpace {
            inward: s.inward,
            from: s.from - s.inward.dot(middle),
        })
        .collect();
    for tetrahedron in kuhn(half) {
        add(&mut out, &tetrahedron, &near);
    }
    out
}

/// Moments of a whole cube.
pub(super) fn whole(middle: &Vector3<f64>, half: f64) -> Moments {
    let volume = 8.0 * half * half * half;
    Moments {
        zeroth: volume,
        second: nalgebra::Matrix3::identity() * (volume * half * half / 3.0),
        ..Moments::zero(*middle)
    }
}

/// Six tetrahedra around a diagonal (Kuhn's division of the cube).
fn kuhn(half: f64) -> [Tetrahedron; 6] {
    let orders = [
        [0, 1, 2],
        [0, 2, 1],
        [1, 0, 2],
        [1, 2, 0],
        [2, 0, 1],
        [2, 1, 0],
    ];
    orders.map(|order| {
        let mut corner = Vector3::repeat(-half);
        let mut out = [corner; 4];
        for (i, k) in order.into_iter().enumerate() {
            corner[k] = half;
            out[i + 1] = corner;
        }
        out
    })
}

fn add(out: &mut Moments, t: &Tetrahedron, spaces: &[HalfSpace]) {
    let Some((space, rest)) = spaces.split_first() else {
        return add_whole(out, t);
    };
    let over = t.map(|p| space.over(&p));
    let mut within = [0; 4];
    let (mut n, mut m) = (0, 4);
    for (i, x) in over.iter().enumerate() {
        if *x > 0.0 {
            within[n] = i;
            n += 1;
        } else {
            m -= 1;
            within[m] = i;
        }
    }
    // Where the edge from i, within, to j, without, meets the plane.
    let meet = |i: usize, j: usize| t[i] + (t[j] - t[i]) * (over[i] / (over[i] - over[j]));
    let [a, b, c, d] = within;
    match n {
        0 => {}
        4 => add(out, t, rest),
        1 => add(out, &[t[a], meet(a, b), meet(a, c), meet(a, d)], rest),
        2 => {
            // A wedge with the triangles a·(ac)(ad) and b·(bc)(bd).
            let low = [t[a], meet(a, c), meet(a, d)];
            let high = [t[b], meet(b, c), meet(b, d)];
            prism(out, low, high, rest);
        }
        _ => {
            let low = [t[a], t[b], t[c]];
            let high = [meet(a, d), meet(b, d), meet(c, d)];
            prism(out, low, high, rest);
        }
    }
}

/// A prism between two triangles whose corners correspond.
fn prism(out: &mut Moments, low: [Vector3<f64>; 3], high: [Vector3<f64>; 3], rest: &[HalfSpace]) {
    add(out, &[low[0], low[1], low[2], high[2]], rest);
    add(out, &[low[0], low[1], high[2], high[1]], rest);
    add(out, &[low[0], high[0], high[1], high[2]], rest);
}

/// Exact moments of a tetrahedron about the origin, whichever way it is wound (as in
/// `moments::solid`).
fn add_whole(out: &mut Moments, [a, b, c, d]: &Tetrahedron) {
    let volume = (b - a).cross(&(c - a)).dot(&(d - a)).abs() / 6.0;
    let s = a + b + c + d;
    let second = a * a.transpose()
        + b * b.transpose()
        + c * c.transpose()
        + d * d.transpose()
        + s * s.transpose();
    out.zeroth += volume;
    out.first += s * (volume / 4.0);
    out.second += second * (volume / 20.0);
}

#[cfg(test)]
mod tests {
    use super::*;

    fn space(n: [f64; 3], from: f64) -> HalfSpace {
        HalfSpace {
            inward: Vector3::from(n),
            from,
        }
    }

    #[test]
    fn a_cube_uncut_is_whole() {
        let at = Vector3::new(3.0, -2.0, 7.0);
        let (got, want) = (cut(&at, 0.5, &[]), whole(&at, 0.5));
        assert!((got.zeroth - 1.0).abs() < 1e-15);
        assert!(got.first.norm() < 1e-15);
        assert!((got.second - want.second).norm() < 1e-15);
    }

    #[test]
    fn cut_corners_and_wedges_have_their_closed_forms() {
        let at = Vector3::new(3.0, -2.0, 7.0);
        // x + y + z ≥ 2 within the unit cube: a corner tetrahedron of 1/6.
        let n = Vector3::repeat(1.0);
        let corner = HalfSpace {
            inward: n,
            from: n.dot(&(at - Vector3::repeat(0.5))) + 2.0,
        };
        let got = cut(&at, 0.5, &[corner]);
        assert!((got.zeroth - 1.0 / 6.0).abs() < 1e-15);
        let centre = got.centre().unwrap() - at;
        assert!((centre - Vector3::repeat(0.25)).norm() < 1e-14, "{centre}");
        // Three faces pushed in: a box.
        let spaces = [
            space([1.0, 0.0, 0.0], at.x - 0.25),
            space([0.0, -1.0, 0.0], -at.y),
            space([0.0, 0.0, 1.0], at.z + 0.4),
        ];
        let got = cut(&at, 0.5, &spaces);
        assert!((got.zeroth - 0.75 * 0.5 * 0.1).abs() < 1e-15);
        assert!(
            (got.inertia().unwrap()[(2, 2)] / got.zeroth - (0.75_f64.powi(2) + 0.25) / 12.0).abs()
                < 1e-14
        );
        // A plane and its opposite part the cube.
        let (n, from) = ([0.48, 0.6, 0.64], 0.1);
        let a = cut(&Vector3::zeros(), 0.5, &[space(n, from)]);
        let b = cut(&Vector3::zeros(), 0.5, &[space(n.map(|x| -x), -from)]);
        assert!((a.zeroth + b.zeroth - 1.0).abs() < 1e-15);
        assert!((a.second + b.second - whole(&Vector3::zeros(), 0.5).second).norm() < 1e-15);
    }
}
