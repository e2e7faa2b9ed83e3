//! Which triangles hang together: union–find that many threads may use at once.

use std::sync::atomic::{AtomicU32, Ordering};

use rayon::prelude::*;

/// Sets of numbers. The number of a set is its least member, whatever the order of joining.
pub(crate) struct Sets(Vec<AtomicU32>);

impl Sets {
    /// `n` sets of one.
    pub(crate) fn new(n: usize) -> Self {
        Self((0..n as u32).into_par_iter().map(AtomicU32::new).collect())
    }

    /// A member of the same set that is no greater.
    #[inline(always)]
    pub(crate) fn above(&self, x: u32) -> u32 {
        self.0[x as usize].load(Ordering::Relaxed)
    }

    /// The same sets once more.
    pub(crate) fn copy(&self) -> Self {
        Self(
            self.0
                .par_iter()
                .map(|a| AtomicU32::new(a.load(Ordering::Relaxed)))
                .collect(),
        )
    }

    /// The least member of the set of `x`.
    #[inline]
    pub(crate) fn find(&self, mut x: u32) -> u32 {
        loop {
            let parent = self.0[x as usize].load(Ordering::Relaxed);
            if parent == x {
                return x;
            }
            let above = self.0[parent as usize].load(Ordering::Relaxed);
            if above != parent {
                // Halving. Any ancestor is a right parent of what is no root, so whichever of
                // several threads writes last does no harm.
                self.0[x as usize].store(above, Ordering::Relaxed);
            }
            x = parent;
        }
    }

    /// Makes one set of the sets of `x` and `y`.
    #[inline]
    pub(crate) fn join(&self, x: u32, y: u32) {
        let (mut x, mut y) = (x, y);
        loop {
            (x, y) = (self.find(x), self.find(y));
            if x == y {
                return;
            }
            let (low, high) = (x.min(y), x.max(y));
            // Only a root may be hung below another; if it no longer is one, look again.
            if self.0[high as usize]
                .compare_exchange(high, low, Ordering::Relaxed, Ordering::Relaxed)
                .is_ok()
            {
                return;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn threads_agree_on_the_least_member() {
        let n = 50_000u32;
        let sets = Sets::new(n as usize);
        // Numbers of one remainder are joined, from both ends at once.
        (0..n - 7).into_par_iter().for_each(|i| sets.join(i, i + 7));
        (0..n).for_each(|i| assert_eq!(sets.find(i), i % 7));
    }
}
