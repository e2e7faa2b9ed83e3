//! Unit cubes on a grid: their surface, and what hangs together, by flood fill.

use super::solids::{P, Tri};

/// Which cubes are there, with a rim of air around.
pub(crate) struct Grid {
    n: usize,
    solid: Vec<bool>,
}

impl Grid {
    /// Of the cubes 0..n on each axis.
    pub(crate) fn of(n: usize, solid: &dyn Fn(i32, i32, i32) -> bool) -> Self {
        let m = n + 2;
        let at = |i: usize| {
            (
                (i % m) as i32 - 1,
                (i / m % m) as i32 - 1,
                (i / m / m) as i32 - 1,
            )
        };
        let solid = (0..m * m * m)
            .map(|i| {
                let (x, y, z) = at(i);
                solid(x, y, z)
            })
            .collect();
        Self { n: m, solid }
    }

    fn neighbours(&self, i: usize, edges: bool) -> Vec<usize> {
        let n = self.n as i32;
        let p = [i as i32 % n, i as i32 / n % n, i as i32 / n / n];
        let mut out = Vec::new();
        for d in 0..27 {
            let step = [d % 3 - 1, d / 3 % 3 - 1, d / 9 - 1];
            let far = step.iter().map(|s: &i32| s.abs()).sum::<i32>();
            let q = [0, 1, 2].map(|k| p[k] + step[k]);
            if (far == 1 || edges && far == 2) && q.iter().all(|x| (0..n).contains(x)) {
                out.push((q[0] + n * q[1] + n * n * q[2]) as usize);
            }
        }
        out
    }

    /// Sizes of the sets of cubes (or of air), ascending.
    fn sets(&self, of: bool, edges: bool) -> Vec<u64> {
        let mut seen = vec![false; self.solid.len()];
        let mut out = Vec::new();
        for start in 0..seen.len() {
            if seen[start] || self.solid[start] != of {
                continue;
            }
            seen[start] = true;
            let mut todo = vec![start];
            let mut size = 0;
            while let Some(i) = todo.pop() {
                size += 1;
                for j in self.neighbours(i, edges) {
                    if !seen[j] && self.solid[j] == of {
                        seen[j] = true;
                        todo.push(j);
                    }
                }
            }
            out.push(size);
        }
        out.sort_unstable();
        out
    }

    /// Sizes of the solids that hang together by faces, or by edges too, ascending.
    pub(crate) fn solids(&self, edges: bool) -> Vec<u64> {
        self.sets(true, edges)
    }

    /// How many pockets of air there are beside the outside, by faces, or by edges too.
    pub(crate) fn pockets(&self, edges: bool) -> usize {
        self.sets(false, edges).len() - 1
    }

    /// Two triangles on every face between a cube and air, outward.
    pub(crate) fn surface(&self) -> Vec<Tri> {
        let n = self.n;
        let strides = [1, n, n * n];
        let mut out = Vec::new();
        for i in (0..self.solid.len()).filter(|&i| self.solid[i]) {
            let p: P = [i % n, i / n % n, i / n / n].map(|x| x as f64);
            for k in 0..3 {
                let (u, v) = ((k + 1) % 3, (k + 2) % 3);
                for up in [false, true] {
                    let j = if up { i + strides[k] } else { i - strides[k] };
                    if self.solid[j] {
                        continue;
                    }
                    let corner = |a: f64, b: f64| {
                        let mut q = p;
                        q[k] += if up { 1.0 } else { 0.0 };
                        q[u] += a;
                        q[v] += b;
                        q
                    };
                    let mut quad = [
                        corner(0.0, 0.0),
                        corner(1.0, 0.0),
                        corner(1.0, 1.0),
                        corner(0.0, 1.0),
                    ];
                    if !up {
                        quad.reverse();
                    }
                    out.push([quad[0], quad[1], quad[2]]);
                    out.push([quad[0], quad[2], quad[3]]);
                }
            }
        }
        out
    }
}
