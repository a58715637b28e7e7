//! One integration binary; each module says what belongs there.

/// Arrows between rooms, banned words in the core, file length.
mod tidy;
