//! The built-in rehearsal: a stage file, a score of invented music, and what there is to hear in it.
//!
//! The stage file stands in `config/`, where players can read it; the score is written here, note by note.

mod scenes;
mod score;

pub use scenes::{Check, Finding, Scene, scenes};
pub use score::score;

/// To be changed by whoever plays with it.
pub const STAGE: &str = include_str!("../../config/rehearsal.yaml");

const C3: u8 = 48;
const G3: u8 = 55;
const GS3: u8 = 56;
const C4: u8 = 60;
const EB4: u8 = 63;
const E4: u8 = 64;
const G4: u8 = 67;
const A4: u8 = 69;
const BB4: u8 = 70;

/// When each scene begins, in seconds.
mod at {
    pub const EQUAL_THIRD: f64 = 1.0;
    pub const PURE_THIRD: f64 = 7.5;
    pub const PURE_CHORD: f64 = 13.0;
    pub const FIFTH: f64 = 17.5;
    pub const EQUAL_PHRASE: f64 = 23.0;
    pub const MEANTONE_PHRASE: f64 = 33.5;
    pub const WOLF: f64 = 44.0;
    pub const NAMED: f64 = 49.0;
    pub const RINGING: f64 = 54.5;
    pub const CHANGE: f64 = 57.5;
    pub const AGAIN: f64 = 62.5;
    pub const NEUTRAL: f64 = 67.0;
    pub const TUNE: f64 = 72.0;
    pub const SINKING: f64 = 78.5;
    pub const STAYING: f64 = 91.5;
    pub const LAST_CHORD: f64 = 104.5;

    /// Of the chords that go round, five times and home.
    pub const LAST_OF_ROUNDS: usize = 20;

    /// When one of them begins, from where the rounds begin. The first and the last are long enough to be measured.
    pub fn round(chord: usize) -> f64 {
        match chord {
            0 => 0.0,
            1..=LAST_OF_ROUNDS => 1.0 + 0.5 * (chord - 1) as f64,
            _ => round(LAST_OF_ROUNDS) + 1.5,
        }
    }
}
