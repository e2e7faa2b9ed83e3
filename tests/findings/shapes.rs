//! Sound meshes of about 100 mm: boxes, a drilled plate, a torus, a hollow box, a wedge.

pub(crate) type Corner = [f64; 3];
pub(crate) type Facet = [Corner; 3];

/// All of them.
pub(crate) fn sound() -> Vec<Vec<Facet>> {
    let hollow = {
        let mut out = grid_box([0.0; 3], [100.0, 80.0, 60.0], 3);
        let inner = grid_box([10.0, 12.0, 14.0], [70.0, 60.0, 50.0], 2);
        out.extend(inner.into_iter().map(|[a, b, c]| [a, c, b]));
        out
    };
    vec![
        grid_box([-50.0; 3], [50.0, 40.0, 30.0], 1),
        grid_box([-50.0; 3], [50.0, 40.0, 30.0], 4),
        drilled_plate(100.0, 20.0, 24),
        torus(40.0, 15.0, 20, 12),
        hollow,
    ]
}

/// Each face cut into n × n squares, each into two facets.
fn grid_box(low: Corner, high: Corner, n: usize) -> Vec<Facet> {
    let at = |k: usize, i: usize| low[k] + (high[k] - low[k]) * i as f64 / n as f64;
    let mut out = Vec::new();
    for axis in 0..3 {
        let (u, v) = ((axis + 1) % 3, (axis + 2) % 3);
        for (end, flip) in [(0, true), (n, false)] {
            for i in 0..n {
                for j in 0..n {
                    let p = |i: usize, j: usize| {
                        let mut q = [0.0; 3];
                        q[axis] = at(axis, end);
                        q[u] = at(u, i);
                        q[v] = at(v, j);
                        q
                    };
                    quad(
                        &mut out,
                        [p(i, j), p(i + 1, j), p(i + 1, j + 1), p(i, j + 1)],
                        flip,
                    );
                }
            }
        }
    }
    out
}

fn quad(out: &mut Vec<Facet>, [a, b, c, d]: [Corner; 4], flip: bool) {
    if flip {
        out.extend([[a, c, b], [a, d, c]]);
    } else {
        out.extend([[a, b, c], [a, c, d]]);
    }
}

/// A square plate with a round hole of `n` sides (a multiple of 8).
fn drilled_plate(side: f64, thickness: f64, n: usize) -> Vec<Facet> {
    let ring = |i: usize| {
        let w = std::f64::consts::TAU * (i % n) as f64 / n as f64;
        (w.cos(), w.sin())
    };
    let inner = |i: usize, z: f64| {
        let (x, y) = ring(i);
        [side * 0.3 * x, side * 0.3 * y, z]
    };
    let outer = |i: usize, z: f64| {
        let (x, y) = ring(i);
        let k = side * 0.5 / f64::max(x.abs(), y.abs());
        [k * x, k * y, z]
    };
    let mut out = Vec::new();
    for i in 0..n {
        let (j, t) = (i + 1, thickness);
        quad(
            &mut out,
            [inner(i, t), outer(i, t), outer(j, t), inner(j, t)],
            false,
        );
        quad(
            &mut out,
            [inner(i, 0.0), outer(i, 0.0), outer(j, 0.0), inner(j, 0.0)],
            true,
        );
        quad(
            &mut out,
            [outer(i, 0.0), outer(j, 0.0), outer(j, t), outer(i, t)],
            false,
        );
        quad(
            &mut out,
            [inner(i, 0.0), inner(j, 0.0), inner(j, t), inner(i, t)],
            true,
        );
    }
    out
}

fn torus(big: f64, small: f64, n: usize, m: usize) -> Vec<Facet> {
    let p = |i: usize, j: usize| {
        let u = std::f64::consts::TAU * (i % n) as f64 / n as f64;
        let v = std::f64::consts::TAU * (j % m) as f64 / m as f64;
        let r = big + small * v.cos();
        [r * u.cos(), r * u.sin(), small * v.sin()]
    };
    let mut out = Vec::new();
    for i in 0..n {
        for j in 0..m {
            quad(
                &mut out,
                [p(i, j), p(i + 1, j), p(i + 1, j + 1), p(i, j + 1)],
                false,
            );
        }
    }
    out
}

/// Faces outward, whichever way its corners turn.
pub(crate) fn tetrahedron(a: Corner, b: Corner, c: Corner, d: Corner) -> Vec<Facet> {
    let e = |p: &Corner| [0, 1, 2].map(|k| p[k] - a[k]);
    let (u, v, w) = (e(&b), e(&c), e(&d));
    let six = u[0] * (v[1] * w[2] - v[2] * w[1])
        + u[1] * (v[2] * w[0] - v[0] * w[2])
        + u[2] * (v[0] * w[1] - v[1] * w[0]);
    let (b, c) = if six > 0.0 { (b, c) } else { (c, b) };
    vec![[a, c, b], [a, b, d], [b, c, d], [c, a, d]]
}
