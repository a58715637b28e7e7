//! What a key means in the chord now sounding.
//!
//! **What this room is**: the methods by which a song's tuning meets its harmony ([`Method`]).
//! **Start reading at** [`Method`].
//! **May know** `pitch/`, `tuning/`, `time`, `limits`.
//! **Owns**: `fixed` is the tuning at rest, exactly.
//! **Not here**: which channel carries the result (`engine/`). Methods that follow the chord are described and checked
//! by the stage file but not played yet.

mod pitch_classes;
pub mod root;

pub use pitch_classes::PitchClasses;

/// How a song's notes are placed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Method {
    /// Every key sounds what its tuning says, always.
    #[default]
    Fixed,
}
