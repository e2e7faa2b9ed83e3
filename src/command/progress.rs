//! Progress on standard error: one line, on a terminal alone, once something takes over a second.

use std::borrow::Cow;
use std::io::{IsTerminal, Write};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

use super::Common;
use crate::progress::{Progress, Watch};

/// What is done sooner than this is not spoken of.
const PATIENCE: Duration = Duration::from_secs(1);
/// How often the line is drawn anew.
const EVERY: Duration = Duration::from_millis(200);

/// Shows the progress of a command until it is dropped, which wipes the line.
pub(super) struct Terminal {
    shared: Arc<Shared>,
    painter: Option<JoinHandle<()>>,
}

#[derive(Default)]
struct Shared {
    state: Mutex<State>,
    stop: Condvar,
}

#[derive(Default)]
struct State {
    stages: Vec<Running>,
    begun: u64,
    over: bool,
}

struct Running {
    number: u64,
    what: Cow<'static, str>,
    steps: u64,
    done: u64,
    since: Instant,
}

impl Shared {
    fn state(&self) -> MutexGuard<'_, State> {
        // A panic elsewhere leaves nothing half done here.
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

impl Terminal {
    /// Quiet with `-q` and where standard error is no terminal.
    pub(super) fn new(common: &Common) -> Self {
        let shared = Arc::new(Shared::default());
        let seen = !common.quiet && std::io::stderr().is_terminal();
        let painter = seen.then(|| {
            let shared = Arc::clone(&shared);
            std::thread::spawn(move || paint(&shared))
        });
        Self { shared, painter }
    }

    /// To hand down.
    pub(super) fn progress(&self) -> Progress<'_> {
        match self.painter {
            Some(_) => Progress::new(&*self.shared),
            None => Progress::NONE,
        }
    }
}

impl Drop for Terminal {
    fn drop(&mut self) {
        self.shared.state().over = true;
        self.shared.stop.notify_all();
        if let Some(painter) = self.painter.take() {
            let _ = painter.join();
        }
    }
}

impl Watch for Shared {
    fn begin(&self, what: Cow<'static, str>, steps: u64) -> u64 {
        let mut state = self.state();
        state.begun += 1;
        let number = state.begun;
        state.stages.push(Running {
            number,
            what,
            steps,
            done: 0,
            since: Instant::now(),
        });
        number
    }

    fn advance(&self, stage: u64, steps: u64) {
        let mut state = self.state();
        if let Some(s) = state.stages.iter_mut().find(|s| s.number == stage) {
            s.done += steps;
        }
    }

    fn end(&self, stage: u64) {
        self.state().stages.retain(|s| s.number != stage);
    }
}

fn paint(shared: &Shared) {
    let mut drawn = false;
    let mut state = shared.state();
    while !state.over {
        (state, _) = shared
            .stop
            .wait_timeout(state, EVERY)
            .unwrap_or_else(PoisonError::into_inner);
        // The innermost stage says most.
        let line = state
            .stages
            .iter()
            .rev()
            .find(|s| s.since.elapsed() >= PATIENCE)
            .filter(|_| !state.over)
            .map(line);
        let Some(line) = line else {
            continue;
        };
        let width = terminal_size::terminal_size_of(std::io::stderr()).map_or(80, |(w, _)| w.0);
        let line: String = line
            .chars()
            .take(usize::from(width).saturating_sub(1))
            .collect();
        let mut err = std::io::stderr().lock();
        let _ = write!(err, "\r\x1b[2K{line}").and_then(|()| err.flush());
        drawn = true;
    }
    if drawn {
        let mut err = std::io::stderr().lock();
        let _ = write!(err, "\r\x1b[2K").and_then(|()| err.flush());
    }
}

fn line(stage: &Running) -> String {
    let what = crate::text::shown(&stage.what);
    let seconds = stage.since.elapsed().as_secs();
    if stage.steps == 0 {
        return format!("{what} … {seconds} s");
    }
    let percent = 100 * stage.done.min(stage.steps) / stage.steps;
    format!("{what} … {percent} %, {seconds} s")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_line_says_what_is_done_and_how_far_it_is() {
        let shared = Shared::default();
        let a = shared.begin("reading".into(), 0);
        let b = shared.begin("pairs".into(), 8);
        shared.advance(b, 3);
        let text = |at: usize| line(&shared.state().stages[at]);
        assert_eq!(text(0), "reading … 0 s");
        assert_eq!(text(1), "pairs … 37 %, 0 s");
        shared.advance(b, 90);
        assert_eq!(text(1), "pairs … 100 %, 0 s");
        shared.end(a);
        assert_eq!(text(0), "pairs … 100 %, 0 s");
    }
}
