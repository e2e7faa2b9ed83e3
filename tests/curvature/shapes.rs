//! Faceted solids whose vertices lie on curved surfaces, with the figures of the curved solid.
#![allow(dead_code, reason = "each test uses some of them")]

use std::collections::HashMap;
use std::f64::consts::{FRAC_PI_2, PI, TAU};

/// A point.
pub(crate) type P = [f64; 3];
/// Three corners.
pub(crate) type Tri = [P; 3];

/// A small generator of numbers (xorshift): the same meshes on every run.
#[derive(Clone)]
pub(crate) struct Random(pub(crate) u64);

impl Random {
    pub(crate) fn unit(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Between −1 and 1.
    pub(crate) fn signed(&mut self) -> f64 {
        2.0 * self.unit() - 1.0
    }

    pub(crate) fn shuffle<T>(&mut self, list: &mut [T]) {
        for i in (1..list.len()).rev() {
            list.swap(i, (self.unit() * (i + 1) as f64) as usize);
        }
    }
}

/// Figures of a curved solid: volume, area, ∫x dV, and ∫x², ∫y², ∫z² dV about the origin.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Truth {
    pub(crate) volume: f64,
    pub(crate) area: f64,
    pub(crate) first: P,
    pub(crate) second: P,
}

/// A faceted solid and the curved one that it stands for.
pub(crate) struct Case {
    pub(crate) name: String,
    pub(crate) facets: Vec<Tri>,
    pub(crate) truth: Truth,
    /// Mesh minus true of the convex and of the concave surfaces, where they are known apart.
    pub(crate) regions: Option<[f64; 2]>,
}

/// A stretch of a profile (r, z), walked counter-clockwise with r to the right and z up.
#[derive(Clone, Copy)]
pub(crate) enum Stretch {
    /// From the point to the next stretch's start.
    Line([f64; 2]),
    /// The same in several steps.
    Rows([f64; 2], usize),
    /// About a centre with a radius, from angle to angle, in steps.
    Arc([f64; 2], f64, f64, f64, usize),
}

impl Stretch {
    fn start(&self) -> [f64; 2] {
        match *self {
            Self::Line(p) | Self::Rows(p, _) => p,
            Self::Arc(c, r, from, ..) => at(c, r, from),
        }
    }
}

/// A point at an angle; sines of whole quarters are exact.
fn at(c: [f64; 2], r: f64, angle: f64) -> [f64; 2] {
    let clean = |x: f64| if x.abs() < 1e-14 { 0.0 } else { x };
    [c[0] + r * clean(angle.cos()), c[1] + r * clean(angle.sin())]
}

/// Points of a closed profile, the stretch that each step belongs to, and whether it is closed.
fn walk(profile: &[Stretch]) -> (Vec<[f64; 2]>, Vec<usize>) {
    let (mut points, mut of) = (Vec::new(), Vec::new());
    for (k, s) in profile.iter().enumerate() {
        match *s {
            Stretch::Line(p) => {
                points.push(p);
                of.push(k);
            }
            Stretch::Rows(p, n) => {
                let next = profile[(k + 1) % profile.len()].start();
                for i in 0..n {
                    let t = i as f64 / n as f64;
                    points.push([p[0] + t * (next[0] - p[0]), p[1] + t * (next[1] - p[1])]);
                    of.push(k);
                }
            }
            Stretch::Arc(c, r, from, to, n) => {
                let next = profile[(k + 1) % profile.len()].start();
                for i in 0..n {
                    points.push(at(c, r, from + (to - from) * i as f64 / n as f64));
                    of.push(k);
                }
                let end = at(c, r, to);
                if (end[0] - next[0]).hypot(end[1] - next[1]) > 1e-9 {
                    points.push(end);
                    of.push(usize::MAX);
                }
            }
        }
    }
    (points, of)
}

/// Fine steps along the true profile: (r, z, dr, dz) with Gauss weights in the differentials.
fn fine(profile: &[Stretch]) -> Vec<(usize, [f64; 4])> {
    // Gauss–Legendre, 5 points.
    let node: [f64; 5] = [
        -0.906_179_845_938_664,
        -0.538_469_310_105_683_1,
        0.0,
        0.538_469_310_105_683_1,
        0.906_179_845_938_664,
    ];
    let weight: [f64; 5] = [
        0.236_926_885_056_189_1,
        0.478_628_670_499_366_47,
        0.568_888_888_888_888_9,
        0.478_628_670_499_366_47,
        0.236_926_885_056_189_1,
    ];
    let mut out = Vec::new();
    let n = profile.len();
    for (k, s) in profile.iter().enumerate() {
        let next = profile[(k + 1) % n].start();
        let mut line = |a: [f64; 2], b: [f64; 2], of| {
            for (x, w) in node.iter().zip(weight) {
                let t = (x + 1.0) / 2.0;
                let d = [b[0] - a[0], b[1] - a[1]];
                out.push((
                    of,
                    [
                        a[0] + t * d[0],
                        a[1] + t * d[1],
                        d[0] * w / 2.0,
                        d[1] * w / 2.0,
                    ],
                ));
            }
        };
        match *s {
            Stretch::Line(p) | Stretch::Rows(p, _) => line(p, next, k),
            Stretch::Arc(c, r, from, to, _) => {
                line(at(c, r, to), next, usize::MAX);
                for i in 0..40 {
                    let step = (to - from) / 40.0;
                    for (x, w) in node.iter().zip(weight) {
                        let a = from + (i as f64 + (x + 1.0) / 2.0) * step;
                        let w = w / 2.0 * step * r;
                        out.push((
                            k,
                            [
                                c[0] + r * a.cos(),
                                c[1] + r * a.sin(),
                                -a.sin() * w,
                                a.cos() * w,
                            ],
                        ));
                    }
                }
            }
        }
    }
    out
}

/// The solid of a profile turned about z (Pappus and Guldin, in integral form).
pub(crate) fn turned_truth(profile: &[Stretch]) -> Truth {
    let mut t = Truth::default();
    for (_, [r, z, dr, dz]) in fine(profile) {
        t.volume += PI * r * r * dz;
        t.area += TAU * r * dr.hypot(dz);
        t.first[2] += PI * r * r * z * dz;
        let across = PI / 4.0 * r.powi(4) * dz;
        t.second[0] += across;
        t.second[1] += across;
        t.second[2] += PI * r * r * z * z * dz;
    }
    t
}

/// How the facets of a turned solid are laid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Lay {
    /// Even steps, all diagonals one way.
    Even,
    /// Uneven steps round and along, diagonals at random, edges flipped, facets shuffled.
    Rough(u64),
}

/// A profile turned about z in `n` steps, with the error of each stretch where they are even.
pub(crate) fn turned(name: &str, profile: &[Stretch], n: usize, lay: Lay) -> Case {
    let (mut points, of) = walk(profile);
    let m = points.len();
    let mut random = Random(match lay {
        Lay::Even => 1,
        Lay::Rough(seed) => seed * 7919 + 13,
    });
    let mut angles: Vec<f64> = (0..n).map(|i| TAU * i as f64 / n as f64).collect();
    if let Lay::Rough(_) = lay {
        for a in &mut angles {
            *a += 0.2 * TAU / n as f64 * random.signed();
        }
        // Points between two steps of one arc slide along it.
        for i in 0..m {
            if of[i] != usize::MAX
                && of[(i + m - 1) % m] == of[i]
                && let Stretch::Arc(c, r, from, to, steps) = profile[of[i]]
            {
                let a = (points[i][1] - c[1]).atan2(points[i][0] - c[0]);
                points[i] = at(c, r, a + 0.2 * (to - from) / steps as f64 * random.signed());
            }
        }
    }
    let mut mesh = Indexed::default();
    // Rows of points; on an arc within a rough lay each has angles of its own.
    let rows: Vec<Vec<usize>> = points
        .iter()
        .enumerate()
        .map(|(i, p)| {
            if p[0] == 0.0 {
                return vec![mesh.point([0.0, 0.0, p[1]], 0); n];
            }
            let own = lay != Lay::Even
                && of[i] != usize::MAX
                && of[(i + m - 1) % m] == of[i]
                && !matches!(profile[of[i]], Stretch::Line(_));
            // No further along a row than the rows lie apart.
            let q = points[(i + 1) % m];
            let apart = (q[0] - p[0]).hypot(q[1] - p[1]) / p[0];
            let shift = 0.2 * (TAU / n as f64).min(apart);
            angles
                .iter()
                .map(|a| {
                    let a = if own { a + shift * random.signed() } else { *a };
                    mesh.point([p[0] * a.cos(), p[0] * a.sin(), p[1]], 0)
                })
                .collect()
        })
        .collect();
    for k in 0..m {
        let l = (k + 1) % m;
        if points[k][0] == 0.0 && points[l][0] == 0.0 {
            continue;
        }
        for i in 0..n {
            let j = (i + 1) % n;
            let q = [rows[k][i], rows[k][j], rows[l][j], rows[l][i]];
            // Only the diagonals of a single row of long facets are free.
            let of = match profile.get(of[k]) {
                Some(Stretch::Line(_)) | None => usize::MAX,
                _ => of[k],
            };
            mesh.quad(q, of, lay != Lay::Even && random.unit() < 0.5);
        }
    }
    let regions = (lay == Lay::Even).then(|| {
        let mut each = HashMap::new();
        for (k, [r, _, _, dz]) in fine(profile) {
            *each.entry(k).or_insert(0.0) -= PI * r * r * dz;
        }
        for k in 0..m {
            let (a, b) = (points[k], points[(k + 1) % m]);
            let square = (a[0] * a[0] + a[0] * b[0] + b[0] * b[0]) / 3.0;
            *each.entry(of[k]).or_insert(0.0) +=
                n as f64 / 2.0 * (TAU / n as f64).sin() * square * (b[1] - a[1]);
        }
        let sum = |sign: f64| each.values().filter(|e| **e * sign > 0.0).sum::<f64>();
        [sum(-1.0), sum(1.0)]
    });
    if lay != Lay::Even {
        mesh.flip(&mut random);
        random.shuffle(&mut mesh.faces);
    }
    Case {
        name: format!("{name} {n} {lay:?}"),
        facets: mesh.facets(),
        truth: turned_truth(profile),
        regions,
    }
}

/// Points with faces that belong to surfaces.
#[derive(Default)]
pub(crate) struct Indexed {
    pub(crate) points: Vec<P>,
    pub(crate) faces: Vec<([usize; 3], usize)>,
}

impl Indexed {
    pub(crate) fn point(&mut self, p: P, _: usize) -> usize {
        self.points.push(p);
        self.points.len() - 1
    }

    /// Two facets, less those that collapse.
    pub(crate) fn quad(&mut self, q: [usize; 4], of: usize, other: bool) {
        let pair = if other {
            [[q[0], q[1], q[3]], [q[1], q[2], q[3]]]
        } else {
            [[q[0], q[1], q[2]], [q[0], q[2], q[3]]]
        };
        for f in pair {
            let p = f.map(|i| self.points[i]);
            if p[0] != p[1] && p[1] != p[2] && p[2] != p[0] {
                self.faces.push((f, of));
            }
        }
    }

    /// Flips edges inside one surface at random where both new facets are sound and face as the old ones.
    pub(crate) fn flip(&mut self, random: &mut Random) {
        let key: HashMap<[u64; 3], usize> = self
            .points
            .iter()
            .enumerate()
            .rev()
            .map(|(i, p)| (p.map(f64::to_bits), i))
            .collect();
        for f in &mut self.faces {
            f.0 = f.0.map(|i| key[&self.points[i].map(f64::to_bits)]);
        }
        for _ in 0..2 {
            let mut halves: HashMap<(usize, usize), usize> = HashMap::new();
            for (t, (f, _)) in self.faces.iter().enumerate() {
                for k in 0..3 {
                    halves.insert((f[k], f[(k + 1) % 3]), t);
                }
            }
            let mut touched = vec![false; self.faces.len()];
            for t in 0..self.faces.len() {
                let k = (random.unit() * 3.0) as usize;
                let f = self.faces[t].0;
                let (a, b, c) = (f[k], f[(k + 1) % 3], f[(k + 2) % 3]);
                let Some(&u) = halves.get(&(b, a)) else {
                    continue;
                };
                if touched[t]
                    || touched[u]
                    || self.faces[t].1 != self.faces[u].1
                    || self.faces[t].1 == usize::MAX
                {
                    continue;
                }
                let d = self.faces[u].0.into_iter().find(|&i| i != a && i != b);
                let Some(d) = d else { continue };
                if halves.contains_key(&(c, d)) || halves.contains_key(&(d, c)) {
                    continue;
                }
                // Towards Delaunay: never a much longer edge.
                let long = |i: usize, j: usize| {
                    let d = sub(self.points[i], self.points[j]);
                    dot(d, d)
                };
                if long(c, d) > 1.5 * long(a, b) {
                    continue;
                }
                let normal = |f: [usize; 3]| {
                    let [p, q, r] = f.map(|i| self.points[i]);
                    cross(sub(q, p), sub(r, p))
                };
                let (old, old2) = (normal(f), normal(self.faces[u].0));
                let (new, new2) = (normal([a, d, c]), normal([d, b, c]));
                let size = |v: P| dot(v, v).sqrt();
                let total = size(old) + size(old2);
                let fits = |v: P| {
                    size(v) > 0.15 * total
                        && dot(v, old) > 0.93 * size(v) * size(old)
                        && dot(v, old2) > 0.93 * size(v) * size(old2)
                };
                if fits(new) && fits(new2) && dot(new, new2) > 0.93 * size(new) * size(new2) {
                    halves.insert((c, d), t);
                    self.faces[t].0 = [a, d, c];
                    self.faces[u].0 = [d, b, c];
                    touched[t] = true;
                    touched[u] = true;
                }
            }
        }
    }

    pub(crate) fn facets(&self) -> Vec<Tri> {
        self.faces
            .iter()
            .map(|f| f.0.map(|i| self.points[i]))
            .collect()
    }
}

/// An extruded outline of lines and arcs that every ray from the origin meets once, less an inner
/// one, between two heights; even steps. Caps are fans or rings of facets.
pub(crate) fn extruded(
    name: &str,
    outer: &[Stretch],
    inner: &[Stretch],
    height: f64,
    rows: usize,
) -> Case {
    let mut facets = Vec::new();
    let mut truth = Truth::default();
    let (mut convex, mut concave) = (0.0, 0.0);
    let mut loops = Vec::new();
    for (outline, sign) in [(outer, 1.0), (inner, -1.0)] {
        let (points, of) = walk(outline);
        let mut each: HashMap<usize, f64> = HashMap::new();
        for (k, [x, y, dx, dy]) in fine(outline) {
            let area = (x * dy - y * dx) / 2.0 * sign;
            truth.volume += area * height;
            // Of the sector from the origin.
            let (cx, cy) = (2.0 / 3.0 * x, 2.0 / 3.0 * y);
            truth.first[0] += area * cx * height;
            truth.first[1] += area * cy * height;
            truth.first[2] += area * height * height / 2.0;
            truth.second[0] += area * x * x / 2.0 * height;
            truth.second[1] += area * y * y / 2.0 * height;
            truth.second[2] += area * height.powi(3) / 3.0;
            truth.area += 2.0 * area + dx.hypot(dy) * height;
            *each.entry(k).or_insert(0.0) -= area * height;
        }
        for i in 0..points.len() {
            let (p, q) = (points[i], points[(i + 1) % points.len()]);
            *each.entry(of[i]).or_insert(0.0) += (p[0] * q[1] - p[1] * q[0]) / 2.0 * sign * height;
            for r in 0..rows {
                let z = [r, r + 1].map(|r| height * r as f64 / rows as f64);
                let c = [
                    [p[0], p[1], z[0]],
                    [q[0], q[1], z[0]],
                    [q[0], q[1], z[1]],
                    [p[0], p[1], z[1]],
                ];
                let both = [[c[0], c[1], c[2]], [c[0], c[2], c[3]]];
                facets.extend(if sign > 0.0 {
                    both
                } else {
                    both.map(|t| [t[0], t[2], t[1]])
                });
            }
        }
        for e in each.values() {
            if *e < 0.0 {
                convex += e;
            } else {
                concave += e;
            }
        }
        loops.push(points);
    }
    for (z, up) in [(0.0, false), (height, true)] {
        let mut cap = Vec::new();
        let lift = |p: [f64; 2]| [p[0], p[1], z];
        let (a, b) = (&loops[0], &loops[1]);
        if b.is_empty() {
            // From the first corner where the outline is convex.
            for i in 1..a.len() - 1 {
                cap.push([lift(a[0]), lift(a[i]), lift(a[i + 1])]);
            }
        } else {
            let angle = |p: [f64; 2]| p[1].atan2(p[0]).rem_euclid(TAU - 1e-12);
            let sorted = |l: &Vec<[f64; 2]>| {
                let mut l = l.clone();
                l.sort_by(|p, q| angle(*p).total_cmp(&angle(*q)));
                l
            };
            let (a, b) = (sorted(a), sorted(b));
            let (mut i, mut j) = (0, 0);
            let turn = |l: &Vec<[f64; 2]>, i: usize| {
                angle(l[i % l.len()]) + if i >= l.len() { TAU } else { 0.0 }
            };
            while i < a.len() || j < b.len() {
                let (p, q) = (a[i % a.len()], b[j % b.len()]);
                if j >= b.len() || (i < a.len() && turn(&a, i + 1) <= turn(&b, j + 1)) {
                    cap.push([lift(p), lift(a[(i + 1) % a.len()]), lift(q)]);
                    i += 1;
                } else {
                    cap.push([lift(p), lift(b[(j + 1) % b.len()]), lift(q)]);
                    j += 1;
                }
            }
        }
        facets.extend(cap.iter().map(|t| if up { *t } else { [t[0], t[2], t[1]] }));
    }
    Case {
        name: name.to_owned(),
        facets,
        truth,
        regions: Some([convex, concave]),
    }
}

/// A box of half sides `half` with all edges and corners rounded to `r` outside of it, in `n`
/// steps a turn (a multiple of four).
pub(crate) fn rounded_box(half: P, r: f64, n: usize) -> Case {
    let q = n / 4;
    let mut mesh = Indexed::default();
    let rows: Vec<Vec<usize>> = (0..2 * (q + 1))
        .map(|k| {
            let upper = k > q;
            let lat = (k - usize::from(upper)) as f64 / q as f64 * FRAC_PI_2 - FRAC_PI_2;
            (0..4 * (q + 1))
                .map(|i| {
                    let corner = i / (q + 1);
                    let lon = (i - corner) as f64 / q as f64 * FRAC_PI_2;
                    let [cx, cy] = at([0.0; 2], 1.0, lon);
                    let [ring, z] = at([0.0; 2], r, lat);
                    let s = [
                        if corner == 0 || corner == 3 {
                            1.0
                        } else {
                            -1.0
                        },
                        if corner < 2 { 1.0 } else { -1.0 },
                        if upper { 1.0 } else { -1.0 },
                    ];
                    let p = [
                        s[0] * half[0] + ring * cx,
                        s[1] * half[1] + ring * cy,
                        s[2] * half[2] + z,
                    ];
                    mesh.point(p, 0)
                })
                .collect()
        })
        .collect();
    for pair in rows.windows(2) {
        let w = pair[0].len();
        for i in 0..w {
            let j = (i + 1) % w;
            mesh.quad([pair[0][i], pair[0][j], pair[1][j], pair[1][i]], 0, false);
        }
    }
    let mut facets = mesh.facets();
    for (row, up) in [(&rows[0], false), (&rows[rows.len() - 1], true)] {
        let c = [0, 1, 2, 3].map(|k| mesh.points[row[k * (q + 1)]]);
        let both = [[c[0], c[1], c[2]], [c[0], c[2], c[3]]];
        facets.extend(if up {
            both
        } else {
            both.map(|t| [t[0], t[2], t[1]])
        });
    }
    let [a, b, c] = half.map(|x| 2.0 * x);
    let truth = Truth {
        volume: a * b * c
            + 2.0 * r * (a * b + b * c + c * a)
            + PI * r * r * (a + b + c)
            + 4.0 / 3.0 * PI * r.powi(3),
        area: 2.0 * (a * b + b * c + c * a) + TAU * r * (a + b + c) + 4.0 * PI * r * r,
        // By symmetry; the second moments are not compared.
        first: [0.0; 3],
        second: [f64::NAN; 3],
    };
    Case {
        name: format!("rounded box {n}"),
        facets,
        truth,
        regions: None,
    }
}

/// A sphere of the icosahedron cut `times` in four, points shifted about by `rough` of an edge.
pub(crate) fn ball(r: f64, times: u32, rough: f64, seed: u64) -> Case {
    let phi = (1.0 + 5f64.sqrt()) / 2.0;
    let mut points: Vec<P> = Vec::new();
    for k in 0..3 {
        for s in [-1.0, 1.0] {
            for t in [-1.0, 1.0] {
                let mut p = [0.0; 3];
                p[k] = s * phi;
                p[(k + 1) % 3] = t;
                points.push(p);
            }
        }
    }
    let mut faces: Vec<[usize; 3]> = Vec::new();
    for i in 0..12 {
        for j in 0..12 {
            for k in 0..12 {
                let near = |a: usize, b: usize| {
                    let d = sub(points[a], points[b]);
                    a != b && dot(d, d) < 4.1
                };
                let [p, q, s] = [i, j, k].map(|i| points[i]);
                if i < j
                    && i < k
                    && near(i, j)
                    && near(j, k)
                    && near(k, i)
                    && dot(cross(sub(q, p), sub(s, p)), p) > 0.0
                {
                    faces.push([i, j, k]);
                }
            }
        }
    }
    let to_sphere = |p: P| {
        let l = dot(p, p).sqrt();
        p.map(|x| x / l)
    };
    for _ in 0..times {
        let mut middles: HashMap<(usize, usize), usize> = HashMap::new();
        let mut next = Vec::new();
        for f in &faces {
            let m = [0, 1, 2].map(|i| {
                let (a, b) = (f[i].min(f[(i + 1) % 3]), f[i].max(f[(i + 1) % 3]));
                *middles.entry((a, b)).or_insert_with(|| {
                    points.push(to_sphere([0, 1, 2].map(|k| points[a][k] + points[b][k])));
                    points.len() - 1
                })
            });
            next.extend([
                [f[0], m[0], m[2]],
                [m[0], f[1], m[1]],
                [m[2], m[1], f[2]],
                m,
            ]);
        }
        faces = next;
    }
    let mut random = Random(seed * 104_729 + 17);
    let edge = 1.1 / f64::from(1 << times);
    for p in &mut points {
        let moved = [0, 1, 2].map(|k| to_sphere(*p)[k] + rough * edge * random.signed());
        *p = to_sphere(moved).map(|x| x * r);
    }
    let mut mesh = Indexed {
        points,
        faces: faces.into_iter().map(|f| (f, 0)).collect(),
    };
    if rough > 0.0 {
        mesh.flip(&mut random);
        random.shuffle(&mut mesh.faces);
    }
    let volume = 4.0 / 3.0 * PI * r.powi(3);
    Case {
        name: format!("ball {times} {rough} {seed}"),
        facets: mesh.facets(),
        truth: Truth {
            volume,
            area: 4.0 * PI * r * r,
            first: [0.0; 3],
            second: [volume * r * r / 5.0; 3],
        },
        regions: None,
    }
}

/// The case with its axes stretched; the area is no longer known.
pub(crate) fn stretched(case: Case, k: P) -> Case {
    let d = k[0] * k[1] * k[2];
    let t = case.truth;
    Case {
        name: format!("{} × {k:?}", case.name),
        facets: case
            .facets
            .iter()
            .map(|f| f.map(|p| [0, 1, 2].map(|i| p[i] * k[i])))
            .collect(),
        truth: Truth {
            volume: t.volume * d,
            area: f64::NAN,
            first: [0, 1, 2].map(|i| t.first[i] * d * k[i]),
            second: [0, 1, 2].map(|i| t.second[i] * d * k[i] * k[i]),
        },
        regions: None,
    }
}

/// Volume, area, first and second moments of the facets about the origin.
pub(crate) fn of_mesh(facets: &[Tri]) -> Truth {
    let mut t = Truth::default();
    for [a, b, c] in facets {
        let n = cross(sub(*b, *a), sub(*c, *a));
        let d = dot(*a, cross(*b, *c));
        t.volume += d / 6.0;
        t.area += dot(n, n).sqrt() / 2.0;
        for k in 0..3 {
            let s = a[k] + b[k] + c[k];
            t.first[k] += d * s / 24.0;
            t.second[k] += d * (a[k] * a[k] + b[k] * b[k] + c[k] * c[k] + s * s) / 120.0;
        }
    }
    t
}

pub(crate) fn sub(a: P, b: P) -> P {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

pub(crate) fn cross(a: P, b: P) -> P {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

pub(crate) fn dot(a: P, b: P) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// Profiles and outlines of the test bodies, with arcs in `n` steps a turn.
pub(crate) mod bodies {
    use super::Stretch::{Arc, Line, Rows};
    use super::*;

    pub(crate) fn cylinder() -> Vec<Stretch> {
        vec![
            Line([0.0, 0.0]),
            Line([3.0, 0.0]),
            Line([3.0, 5.0]),
            Line([0.0, 5.0]),
        ]
    }

    pub(crate) fn rows(n: usize) -> Vec<Stretch> {
        vec![
            Line([0.0, 0.0]),
            Rows([3.0, 0.0], n / 4),
            Line([3.0, 5.0]),
            Line([0.0, 5.0]),
        ]
    }

    pub(crate) fn disc() -> Vec<Stretch> {
        vec![
            Line([0.0, 0.0]),
            Line([50.0, 0.0]),
            Line([50.0, 2.0]),
            Line([0.0, 2.0]),
        ]
    }

    pub(crate) fn tube() -> Vec<Stretch> {
        vec![
            Line([2.0, 0.0]),
            Line([3.0, 0.0]),
            Line([3.0, 5.0]),
            Line([2.0, 5.0]),
        ]
    }

    pub(crate) fn cone() -> Vec<Stretch> {
        vec![Line([0.0, 0.0]), Line([3.0, 0.0]), Line([0.0, 5.0])]
    }

    pub(crate) fn flat_cone() -> Vec<Stretch> {
        vec![Line([0.0, 0.0]), Line([3.0, 0.0]), Line([0.0, 0.6])]
    }

    pub(crate) fn frustum() -> Vec<Stretch> {
        vec![
            Line([0.0, 0.0]),
            Line([3.0, 0.0]),
            Line([1.0, 5.0]),
            Line([0.0, 5.0]),
        ]
    }

    pub(crate) fn sphere(n: usize) -> Vec<Stretch> {
        vec![Arc([0.0; 2], 3.0, -FRAC_PI_2, FRAC_PI_2, n / 2)]
    }

    pub(crate) fn cap(n: usize) -> Vec<Stretch> {
        vec![
            Line([0.0, 1.5]),
            Arc([0.0; 2], 3.0, FRAC_PI_2 / 3.0, FRAC_PI_2, n / 6),
        ]
    }

    pub(crate) fn torus(n: usize) -> Vec<Stretch> {
        vec![Arc([4.0, 0.0], 1.0, 0.0, TAU, n)]
    }

    pub(crate) fn capsule(n: usize) -> Vec<Stretch> {
        vec![
            Arc([0.0, -4.0], 3.0, -FRAC_PI_2, 0.0, n / 4),
            Arc([0.0, 4.0], 3.0, 0.0, FRAC_PI_2, n / 4),
        ]
    }

    /// A puck with its upper rim rounded.
    pub(crate) fn puck(n: usize) -> Vec<Stretch> {
        vec![
            Line([0.0, 0.0]),
            Line([10.0, 0.0]),
            Arc([9.0, 3.0], 1.0, 0.0, FRAC_PI_2, n / 4),
            Line([0.0, 4.0]),
        ]
    }

    /// A flange: bore, hub with a hollow fillet to the disc, rounded rim.
    pub(crate) fn flange(n: usize) -> Vec<Stretch> {
        vec![
            Line([4.0, 0.0]),
            Line([20.0, 0.0]),
            Arc([19.0, 2.0], 1.0, 0.0, FRAC_PI_2, n / 4),
            Arc([10.0, 5.0], 2.0, 3.0 * FRAC_PI_2, PI, n / 4),
            Line([8.0, 12.0]),
            Line([4.0, 12.0]),
        ]
    }

    fn arcs(half: [f64; 2], r: f64, n: usize) -> Vec<Stretch> {
        (0..4)
            .map(|k| {
                let s = [
                    if k == 0 || k == 3 { 1.0 } else { -1.0 },
                    if k < 2 { 1.0 } else { -1.0 },
                ];
                let from = FRAC_PI_2 * k as f64;
                Arc(
                    [s[0] * half[0], s[1] * half[1]],
                    r,
                    from,
                    from + FRAC_PI_2,
                    n / 4,
                )
            })
            .collect()
    }

    /// A slab with rounded upright edges.
    pub(crate) fn slab(n: usize) -> Case {
        extruded(
            &format!("slab {n}"),
            &arcs([30.0, 8.0], 2.0, n),
            &[],
            6.0,
            1,
        )
    }

    /// A cube with one edge rounded.
    pub(crate) fn one_fillet(n: usize) -> Case {
        let outline = [
            Line([-5.0, -5.0]),
            Line([5.0, -5.0]),
            Arc([3.0, 3.0], 2.0, 0.0, FRAC_PI_2, n / 4),
            Line([-5.0, 5.0]),
        ];
        extruded(&format!("one fillet {n}"), &outline, &[], 10.0, 1)
    }

    /// A block with a round hole.
    pub(crate) fn drilled(n: usize, rows: usize) -> Case {
        let mut square = Vec::new();
        for k in 0..4 {
            let [c, s] = [[5.0, -5.0], [5.0, 5.0], [-5.0, 5.0], [-5.0, -5.0]][k];
            let [d, t] = [[5.0, 0.0], [0.0, 5.0], [-5.0, 0.0], [0.0, -5.0]][k];
            square.extend([Line([c, s]), Line([d, t])]);
        }
        let hole = [Arc([0.0; 2], 3.0, 0.0, TAU, n)];
        extruded(
            &format!("drilled {n} rows {rows}"),
            &square,
            &hole,
            7.0,
            rows,
        )
    }

    /// A plate with rounded corners and a through pocket with rounded corners.
    pub(crate) fn pocket(n: usize) -> Case {
        extruded(
            &format!("pocket {n}"),
            &arcs([40.0, 20.0], 5.0, n),
            &arcs([20.0, 10.0], 3.0, n),
            8.0,
            2,
        )
    }
}
