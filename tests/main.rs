//! One integration binary; each module says what belongs there.

/// Rig, receiver and figures that the others use.
mod support;

/// Arrows between rooms, banned words in the core, file length.
mod tidy;
