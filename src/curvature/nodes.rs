//! Nodes: a corner point as one smooth region sees it. Across a crease a point is several nodes.

use super::surface::{NEXT, NONE, Surface};

/// Disjoint sets, small and sequential: the numbering must not depend on threads.
pub(super) struct Groups(Vec<u32>);

impl Groups {
    pub(super) fn new(n: usize) -> Self {
        Self((0..n as u32).collect())
    }

    pub(super) fn find(&mut self, mut i: u32) -> u32 {
        while self.0[i as usize] != i {
            self.0[i as usize] = self.0[self.0[i as usize] as usize];
            i = self.0[i as usize];
        }
        i
    }

    pub(super) fn join(&mut self, a: u32, b: u32) {
        let (a, b) = (self.find(a), self.find(b));
        self.0[a.max(b) as usize] = a.min(b);
    }

    /// Numbers from 0 for the sets, in order of their first members; and how many there are.
    pub(super) fn numbers(mut self) -> (Vec<u32>, usize) {
        let mut number = vec![NONE; self.0.len()];
        let mut count = 0;
        for i in 0..self.0.len() {
            let root = self.find(i as u32) as usize;
            if number[root] == NONE {
                number[root] = count;
                count += 1;
            }
            number[i] = number[root];
        }
        (number, count as usize)
    }
}

/// The node of each corner of each facet, and how many nodes there are.
pub(super) fn nodes(s: &Surface, smooth: &[bool]) -> (Vec<[u32; 3]>, usize) {
    let mut groups = Groups::new(3 * s.corners.len());
    for (h, _) in smooth.iter().enumerate().filter(|(_, smooth)| **smooth) {
        let o = s.opposite[h] as usize;
        if h < o {
            let (t, k, u, l) = (h / 3, h % 3, o / 3, o % 3);
            groups.join((3 * t + k) as u32, (3 * u + NEXT[l]) as u32);
            groups.join((3 * t + NEXT[k]) as u32, (3 * u + l) as u32);
        }
    }
    let (number, count) = groups.numbers();
    (number.as_chunks::<3>().0.to_vec(), count)
}
