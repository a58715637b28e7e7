//! One integration binary; each module says what belongs there.

/// Rig, receiver and figures that the others use.
mod support;

/// Bytes to messages, and parameter sequences, against printed examples.
mod midi_stream;

/// Arrows between rooms, banned words in the core, file length.
mod tidy;
