//! Whoever asks a server that stands still is kept for as long as it does. So it is asked on a thread of its own, and
//! nobody here waits longer for an answer than they said.

use crate::ports::system::Bell;
use std::sync::mpsc::{Receiver, RecvTimeoutError, channel};
use std::time::Duration;

/// A question under way. If it is dropped, the work still goes on, and its answer is dropped when it comes.
pub struct Asked<T>(Receiver<T>);

impl<T: Send + 'static> Asked<T> {
    /// The bell rings when there is an answer. `None`: there is no thread to be had.
    pub fn begin(
        who: &str,
        bell: Option<Bell>,
        work: impl FnOnce() -> T + Send + 'static,
    ) -> Option<Asked<T>> {
        let (answer, answered) = channel();
        let work = move || {
            // Fails where nobody waits any more.
            let _ = answer.send(work());
            bell.iter().for_each(Bell::ring);
        };
        let thread = std::thread::Builder::new().name(who.to_string());
        thread.spawn(work).ok()?;
        Some(Asked(answered))
    }

    /// # Errors
    /// There is none yet, or whoever worked at it has failed.
    pub fn answer(&self, at_most: Duration) -> Result<T, RecvTimeoutError> {
        self.0.recv_timeout(at_most)
    }
}

/// Waits for an answer; `None` if there is none by then.
pub fn ask<T: Send + 'static>(
    who: &str,
    at_most: Duration,
    work: impl FnOnce() -> T + Send + 'static,
) -> Option<T> {
    Asked::begin(who, None, work)?.answer(at_most).ok()
}
