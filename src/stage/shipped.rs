//! The tunings that come with trued, read by the same code as a player's own.

/// Name and text of each.
pub const SHIPPED: &[(&str, &str)] = &[];
