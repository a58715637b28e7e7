//! Keeps the process callback out: for good once a client is to be closed (a library may end its thread at any
//! instruction, and that must not be one of ours), for a while when somebody else plays in its place.

use std::sync::atomic::{AtomicU8, Ordering};

const OPEN: u8 = 0;
const INSIDE: u8 = 1;
const SHUT: u8 = 2;

/// One callback goes in and out; whoever closes waits until it is out.
#[derive(Debug, Default)]
pub struct Gate(AtomicU8);

/// Somebody is inside as long as this lives.
pub struct Inside<'a>(&'a Gate);

impl Gate {
    /// `None` while it is shut.
    pub fn enter(&self) -> Option<Inside<'_>> {
        let (relaxed, acquire) = (Ordering::Relaxed, Ordering::Acquire);
        let entered = self.0.compare_exchange(OPEN, INSIDE, acquire, relaxed);
        entered.ok().map(|_| Inside(self))
    }

    /// False as long as somebody is inside; once true, nobody comes in any more until it is opened.
    pub fn shut(&self) -> bool {
        let acquire = Ordering::Acquire;
        let shut = self.0.compare_exchange(OPEN, SHUT, acquire, acquire);
        shut.is_ok() || shut == Err(SHUT)
    }

    /// By whoever shut it.
    pub fn open(&self) {
        self.0.store(OPEN, Ordering::Release);
    }
}

impl Drop for Inside<'_> {
    fn drop(&mut self) {
        self.0.0.store(OPEN, Ordering::Release);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn shut_only_when_nobody_is_inside_and_then_until_it_is_opened() {
        let gate = Gate::default();
        let inside = gate.enter().expect("open");
        assert!(!gate.shut());
        drop(inside);
        assert!(gate.enter().is_some());
        assert!(gate.shut() && gate.shut());
        assert!(gate.enter().is_none());
        gate.open();
        assert!(gate.enter().is_some());
    }
}
