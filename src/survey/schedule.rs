//! Files weighed side by side, large ones first, within a budget of memory.

use std::cmp::Reverse;
use std::collections::BTreeSet;
use std::sync::{Condvar, Mutex, MutexGuard, PoisonError};

use crate::error::{Error, Kind, Result};

/// Memory that a file of `bytes` is reckoned to need while it is weighed: its bytes, its triangles,
/// what welds them. A reckoning with room to spare, not a measurement; the megabyte is for small
/// files.
pub(super) fn needs(bytes: u64) -> u64 {
    bytes.saturating_mul(4).saturating_add(1 << 20)
}

/// Files of at least this many bytes go one by one with all threads each: side by side they would
/// hold several times the memory and be done no sooner.
const ALONE: u64 = 64 << 20;

/// What is left to do.
struct Left {
    /// By need, then in order.
    queue: BTreeSet<(Reverse<u64>, usize)>,
    in_use: u64,
    stop: bool,
}

struct Shared {
    left: Mutex<Left>,
    changed: Condvar,
    budget: u64,
}

impl Shared {
    fn lock(&self) -> MutexGuard<'_, Left> {
        // A count stays right whoever has panicked while holding it.
        self.left.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// The largest file that there is room for; waits for room. `None` once nothing is left.
    fn next(&self) -> Option<(usize, u64)> {
        let mut left = self.lock();
        loop {
            if left.stop || left.queue.is_empty() {
                return None;
            }
            let room = self.budget.saturating_sub(left.in_use);
            let fits = left.queue.range((Reverse(room), 0)..).next().copied();
            // Alone, a file is taken whatever it needs: those past the budget are not in here.
            let chosen = fits.or_else(|| left.queue.first().copied().filter(|_| left.in_use == 0));
            if let Some(entry) = chosen {
                left.queue.remove(&entry);
                let (Reverse(need), file) = entry;
                left.in_use += need;
                return Some((file, need));
            }
            left = self
                .changed
                .wait(left)
                .unwrap_or_else(PoisonError::into_inner);
        }
    }

    fn give_back(&self, need: u64, go_on: bool) {
        let mut left = self.lock();
        left.in_use = left.in_use.saturating_sub(need);
        left.stop |= !go_on;
        self.changed.notify_all();
    }
}

/// Calls `work` once for each file of `(number, bytes)`, large ones first; it says whether to go
/// on. Returns whether all were done.
///
/// Each thread is a pool of its own: what works in parallel inside one small file would otherwise
/// wait for, and begin, other files while it holds its own.
///
/// # Errors
/// `too-large` where no thread can be had.
pub(super) fn run(
    files: &[(usize, u64)],
    budget: u64,
    work: &(dyn Fn(usize) -> bool + Sync),
) -> Result<bool> {
    let mut alone: Vec<(Reverse<u64>, usize)> = Vec::new();
    let mut queue = BTreeSet::new();
    for &(file, bytes) in files {
        let entry = (Reverse(needs(bytes)), file);
        if bytes >= ALONE {
            alone.push(entry);
        } else {
            queue.insert(entry);
        }
    }
    alone.sort();
    for (_, file) in alone {
        if !work(file) {
            return Ok(false);
        }
    }
    let threads = rayon::current_num_threads().min(queue.len());
    let shared = Shared {
        left: Mutex::new(Left {
            queue,
            in_use: 0,
            stop: false,
        }),
        changed: Condvar::new(),
        budget,
    };
    let failed = |e: &dyn std::fmt::Display| {
        Error::new(
            Kind::TooLarge,
            format!("cannot begin a thread: {e}"),
            "use fewer with --threads",
        )
    };
    let of_thread = || -> Result<()> {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(1)
            .use_current_thread()
            .build()
            .map_err(|e| failed(&e))?;
        pool.install(|| {
            while let Some((file, need)) = shared.next() {
                let go_on = work(file);
                shared.give_back(need, go_on);
            }
        });
        Ok(())
    };
    std::thread::scope(|scope| {
        let begin = |_| {
            let thread = std::thread::Builder::new().stack_size(8 << 20);
            thread
                .spawn_scoped(scope, of_thread)
                .map_err(|e| failed(&e))
        };
        let begun: Vec<_> = (0..threads).map(begin).collect();
        for thread in begun {
            match thread?.join() {
                Ok(done) => done?,
                Err(panic) => std::panic::resume_unwind(panic),
            }
        }
        Ok::<(), Error>(())
    })?;
    Ok(!shared.lock().stop)
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::atomic::{AtomicU64, Ordering::SeqCst};

    #[test]
    fn all_files_are_done_large_first_and_never_past_the_budget() {
        let sizes: Vec<(usize, u64)> = (0..300u64)
            .map(|i| (i as usize, (i * 7919) % 3000 * 1000))
            .collect();
        let budget = 20 << 20;
        let (now, most, done) = (AtomicU64::new(0), AtomicU64::new(0), Mutex::new(Vec::new()));
        let all = run(&sizes, budget, &|f| {
            let need = needs(sizes[f].1);
            most.fetch_max(now.fetch_add(need, SeqCst) + need, SeqCst);
            done.lock().unwrap().push(f);
            std::thread::yield_now();
            now.fetch_sub(need, SeqCst);
            true
        });
        assert!(all.unwrap());
        assert!(most.load(SeqCst) <= budget, "{most:?}");
        let mut done = done.into_inner().unwrap();
        // The first is among the largest.
        assert!(sizes[done[0]].1 > 2_900_000, "{}", sizes[done[0]].1);
        done.sort_unstable();
        assert_eq!(done, (0..300).collect::<Vec<_>>());
        let count = AtomicU64::new(0);
        let stopped = run(&sizes, budget, &|_| count.fetch_add(1, SeqCst) < 10);
        assert!(!stopped.unwrap() && count.load(SeqCst) < 100);
    }
}
