//! What a terminal can show, and marks that only repeat what a word says.

/// How a cell is marked where colour is allowed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Mark {
    /// Not at all.
    #[default]
    Plain,
    /// Good news.
    Pass,
    /// Bad news.
    Fail,
    /// Neither is known.
    Unsure,
    /// A heading or a total.
    Heading,
    /// Less important.
    Dim,
}

impl Mark {
    fn code(self) -> &'static str {
        match self {
            Self::Plain => "",
            Self::Pass => "\u{1b}[32m",
            Self::Fail => "\u{1b}[1;31m",
            Self::Unsure => "\u{1b}[33m",
            Self::Heading => "\u{1b}[1m",
            Self::Dim => "\u{1b}[2m",
        }
    }
}

/// What the output can show.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Look {
    /// Columns of the terminal; `None` for as wide as it gets (a pipe or a file).
    pub width: Option<usize>,
    /// Colour and weight are allowed.
    pub colour: bool,
}

impl Look {
    /// `text` under `mark`, if that may be shown.
    pub fn marked(self, text: &str, mark: Mark) -> String {
        if self.colour && mark != Mark::Plain && !text.is_empty() {
            format!("{}{text}\u{1b}[0m", mark.code())
        } else {
            text.to_owned()
        }
    }

    /// What standard output can show: colour on a terminal unless `NO_COLOR` is set and not
    /// empty (no-color.org) or the terminal is dumb.
    #[cfg(feature = "cli")]
    pub fn of_standard_output() -> Self {
        use std::io::IsTerminal;
        if !std::io::stdout().is_terminal() {
            return Self::default();
        }
        let refused = std::env::var_os("NO_COLOR").is_some_and(|v| !v.is_empty())
            || std::env::var_os("TERM").is_some_and(|v| v == "dumb");
        Self {
            width: terminal_size::terminal_size().map(|(w, _)| usize::from(w.0)),
            colour: !refused,
        }
    }
}
