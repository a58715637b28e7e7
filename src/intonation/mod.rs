//! What a key means in the chord now sounding.
//!
//! **What this room is**: the methods by which a song's tuning meets its harmony ([`Method`]), and one harmonic context
//! that follows what is played ([`Harmony`]).
//! **Start reading at** [`Harmony`], then `place.rs` (where a chord is put) and `shapes.rs` (its exact intervals).
//! **May know** `pitch/`, `tuning/`, `time`, `limits`.
//! **Owns**: `fixed` is the tuning at rest, exactly. All keys of a pitch class stand alike. A note that has sounded
//! beyond the settle window never jumps.
//! **Not here**: which channel carries the result (`engine/`), how it is written (`stage/`).

mod candidates;
mod chord;
mod harmony;
mod lattice;
pub mod least_squares;
mod pitch_classes;
mod place;
pub mod root;
mod settings;
mod shapes;
pub mod spelling;

pub use chord::Chord;
pub use harmony::{Harmony, Sevenths, Standing};
pub use pitch_classes::PitchClasses;
pub use settings::{Method, Ratios, Settings};
pub use shapes::Shapes;
