//! Progress on standard error: one line, on a terminal alone, once something takes over a second.

use std::borrow::Cow;
use std::io::{IsTerminal, Write};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

use unicode_width::UnicodeWidthChar as _;

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
        // A terminal that cannot go back to the start of its line would get a line every time.
        let dumb = std::env::var_os("TERM").is_some_and(|t| t == "dumb");
        let seen = !common.quiet && !dumb && std::io::stderr().is_terminal();
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
    let begun = Instant::now();
    let mut drawn = String::new();
    let wipe = |text: &str| {
        let mut err = std::io::stderr().lock();
        let _ = write!(err, "\r\x1b[2K{text}").and_then(|()| err.flush());
    };
    let mut state = shared.state();
    while !state.over {
        (state, _) = shared
            .stop
            .wait_timeout(state, EVERY)
            .unwrap_or_else(PoisonError::into_inner);
        if state.over || begun.elapsed() < PATIENCE {
            continue;
        }
        // The innermost stage says most. Many short ones are one long wait, so it is the command's
        // time that counts and not theirs; what has ended is not shown as if it went on.
        let line = state.stages.last().map(line).unwrap_or_default();
        if line != drawn {
            let width = terminal_size::terminal_size_of(std::io::stderr()).map_or(80, |(w, _)| w.0);
            wipe(cut(&line, usize::from(width).saturating_sub(1)));
            drawn = line;
        }
    }
    if !drawn.is_empty() {
        wipe("");
    }
}

/// As much of a line as fits, so that it never wraps: what has wrapped cannot be wiped.
fn cut(line: &str, columns: usize) -> &str {
    let mut used = 0;
    let end = line.char_indices().find(|(_, c)| {
        used += c.width().unwrap_or(0);
        used > columns
    });
    end.map_or(line, |(at, _)| &line[..at])
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

    #[test]
    fn a_line_is_cut_by_the_columns_that_it_takes() {
        assert_eq!(cut("reading", 7), "reading");
        assert_eq!(cut("reading", 4), "read");
        assert_eq!(cut("\u{8f66}\u{8f6e}x", 3), "\u{8f66}");
        assert_eq!(cut("\u{8f66}\u{8f6e}x", 5), "\u{8f66}\u{8f6e}x");
        assert_eq!(cut("x", 0), "");
    }
}
