//! The same engine on a file's clock.
//!
//! **What this room is**: MIDI files read and written (`score_file`, `score_clock`), a score played through the engine
//! (`retune`), what was played as sound (`font`, `receiver`, `listen`), lines (`notes_file`) and a picture (`picture`),
//! and what there is to hear measured from that sound (`measure`, `moments`). `demo` is the built-in rehearsal.
//! **Start reading at** [`retune::play`].
//! **May know** `stage/`, `engine/`, `tuning/`, `pitch/`, `midi/`, `time`, `limits`.
//! **Owns** midly, hound, rustysynth. The same score and stage file give the same bytes every time.
//! **Not here**: ports and clocks (`ports/`), what is said to people about it (`cli/`).

pub mod beats;
pub mod chart;
pub mod chart_text;
pub mod demo;
pub mod font;
pub mod listen;
pub mod measure;
pub mod moments;
pub mod notes_file;
pub mod picture;
pub mod receiver;
pub mod retune;
pub mod score_clock;
pub mod score_file;
pub mod tuning_dump;
