//! What a long call takes along: a way to stop it, and a way to hear how far it is.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

/// Called with (done, total) from time to time, from any thread.
pub type Progress = Arc<dyn Fn(u64, u64) + Send + Sync>;

/// Cancel flag, progress report and budget of a long call. The default never stops and reports to nobody.
#[derive(Clone, Default)]
pub struct Control {
    /// Set to true to stop; work done so far is kept where that makes sense.
    pub cancel: Arc<AtomicBool>,
    /// Hears (done, total).
    pub progress: Option<Progress>,
    /// Most nodes a decision diagram may have; 0 takes the default of the state set.
    pub nodes: usize,
}

impl Control {
    /// Has the caller asked to stop?
    pub fn cancelled(&self) -> bool {
        self.cancel.load(Ordering::Relaxed)
    }

    /// Tells the caller how far the work is.
    pub fn report(&self, done: u64, total: u64) {
        if let Some(progress) = &self.progress {
            progress(done, total);
        }
    }
}

impl std::fmt::Debug for Control {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Control").field("cancel", &self.cancelled()).field("nodes", &self.nodes).finish_non_exhaustive()
    }
}
