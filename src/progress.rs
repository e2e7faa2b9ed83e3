//! Progress of long work, told to whoever asked for it; the library itself prints nothing.

use std::borrow::Cow;

/// Is told what is being done. Stages may run side by side; each is known by its number.
pub trait Watch: Sync {
    /// A stage begins: what it does, in a few words, and of how many steps (0 for not known).
    fn begin(&self, what: Cow<'static, str>, steps: u64) -> u64;
    /// So many more steps of a stage are done. May be called from several threads.
    fn advance(&self, stage: u64, steps: u64);
    /// A stage has ended.
    fn end(&self, stage: u64);
}

/// What is handed down to long work: who watches it, if anyone does.
#[derive(Clone, Copy, Default)]
pub struct Progress<'a>(Option<&'a dyn Watch>);

impl<'a> Progress<'a> {
    /// Nobody watches.
    pub const NONE: Progress<'static> = Progress(None);

    /// Tells `watch`.
    pub fn new(watch: &'a dyn Watch) -> Self {
        Self(Some(watch))
    }

    /// Begins a stage of `steps` steps (0 for not known); it ends when it is dropped.
    #[must_use = "the stage ends when it is dropped"]
    pub fn stage(self, what: impl Into<Cow<'static, str>>, steps: usize) -> Stage<'a> {
        Stage(self.0.map(|w| (w, w.begin(what.into(), steps as u64))))
    }
}

/// A stage of long work, from [`Progress::stage`].
pub struct Stage<'a>(Option<(&'a dyn Watch, u64)>);

impl Stage<'_> {
    /// So many more steps are done.
    pub fn advance(&self, steps: usize) {
        if let Some((watch, stage)) = self.0 {
            watch.advance(stage, steps as u64);
        }
    }
}

impl Drop for Stage<'_> {
    fn drop(&mut self) {
        if let Some((watch, stage)) = self.0 {
            watch.end(stage);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::Mutex;

    #[derive(Default)]
    struct Told(Mutex<Vec<String>>);

    impl Watch for Told {
        fn begin(&self, what: Cow<'static, str>, steps: u64) -> u64 {
            let mut told = self.0.lock().unwrap();
            told.push(format!("{what} {steps}"));
            told.len() as u64
        }
        fn advance(&self, stage: u64, steps: u64) {
            self.0.lock().unwrap().push(format!("{stage}+{steps}"));
        }
        fn end(&self, stage: u64) {
            self.0.lock().unwrap().push(format!("{stage} ends"));
        }
    }

    #[test]
    fn stages_begin_advance_and_end_in_turn() {
        let told = Told::default();
        let progress = Progress::new(&told);
        {
            let outer = progress.stage("outer", 2);
            let inner = progress.stage("inner", 0);
            drop(inner);
            outer.advance(2);
        }
        Progress::NONE.stage("unseen", 1).advance(1);
        let told = told.0.into_inner().unwrap();
        assert_eq!(told, ["outer 2", "inner 0", "2 ends", "1+2", "1 ends"]);
    }
}
