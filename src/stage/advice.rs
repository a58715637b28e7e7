//! What is worth knowing about an evening and is not wrong.

use super::complaint::Complaints;

/// What has been found while a stage file is read: what is wrong, and what is only worth knowing.
#[derive(Debug, Default)]
pub struct Findings {
    pub complaints: Complaints,
    pub advice: Vec<String>,
}

impl Findings {
    /// A line of advice; the same line only once.
    pub fn advise(&mut self, line: impl Into<String>) {
        let line = line.into();
        if !self.advice.contains(&line) {
            self.advice.push(line);
        }
    }

    /// Something that is read and checked, but that nothing plays yet. Never silently dropped.
    pub fn not_played(&mut self, what: impl std::fmt::Display) {
        self.advise(format!(
            "{what} is understood but not played by this version"
        ));
    }
}
