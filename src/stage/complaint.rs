//! What is wrong with a file, where, and what would be right.

use std::fmt;
use std::path::{Path, PathBuf};

/// One step on the way to a node.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Segment {
    /// Into a map, to the value under a key.
    Key(String),
    /// Into a list.
    Item(usize),
    /// The key itself.
    Name(String),
    /// The key itself, where it stands for the second time.
    Again(String),
}

/// The way to a node: a file (by place in `Complaints::files`) and steps into it.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Trail {
    pub file: usize,
    pub steps: Vec<Segment>,
}

impl Trail {
    pub fn root(file: usize) -> Trail {
        Trail {
            file,
            steps: Vec::new(),
        }
    }

    pub fn then(&self, step: Segment) -> Trail {
        let mut trail = self.clone();
        trail.steps.push(step);
        trail
    }
}

/// `file:line:column: what is wrong; what would be right`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Complaint {
    pub file: PathBuf,
    /// From 1; 0 where no place can be given (a file that cannot be read).
    pub line: usize,
    pub column: usize,
    pub wrong: String,
    pub right: String,
}

impl fmt::Display for Complaint {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let file = self.file.display();
        match self.line {
            0 => write!(f, "{file}: {}; {}", self.wrong, self.right),
            line => write!(
                f,
                "{file}:{line}:{}: {}; {}",
                self.column, self.wrong, self.right
            ),
        }
    }
}

/// Everything found wrong so far, and the texts it was found in.
#[derive(Debug, Default)]
pub struct Complaints {
    files: Vec<(PathBuf, String)>,
    found: Vec<Complaint>,
    /// Lines, with their file, that are known not to be read as they were meant.
    settled: Vec<(usize, usize)>,
    /// Texts that stand for the files of these absolute paths; where there are any, the disk is not read.
    kept: Vec<(PathBuf, String)>,
}

impl Complaints {
    /// For a stage that is read from a copy of its files; with none, from the disk.
    pub fn reading(kept: &[(PathBuf, String)]) -> Complaints {
        Complaints {
            kept: kept.to_vec(),
            ..Complaints::default()
        }
    }

    /// The text of a file that the stage names.
    ///
    /// # Errors
    /// It is not there, cannot be read, or is not UTF-8.
    pub fn read(&self, path: &Path) -> std::io::Result<String> {
        if self.kept.is_empty() {
            return std::fs::read_to_string(path);
        }
        let text = self.kept_text(path).ok_or(std::io::ErrorKind::NotFound)?;
        Ok(text.to_string())
    }

    /// Whether there is such a file.
    pub fn has_file(&self, path: &Path) -> bool {
        if self.kept.is_empty() {
            return path.is_file();
        }
        self.kept_text(path).is_some()
    }

    fn kept_text(&self, path: &Path) -> Option<&str> {
        let path = std::path::absolute(path).ok()?;
        let found = self.kept.iter().find(|(kept, _)| *kept == path);
        found.map(|(_, text)| text.as_str())
    }

    /// What stood in files that were read.
    pub fn texts(&self, files: &[PathBuf]) -> Vec<String> {
        let text = |file: &PathBuf| {
            let found = self.files.iter().find(|(path, _)| path == file);
            found.map_or(String::new(), |(_, text)| text.clone())
        };
        files.iter().map(text).collect()
    }

    /// Takes in a file's text, so that complaints about it can be given a line. Returns its number for [`Trail::root`].
    pub fn add_file(&mut self, path: &Path, text: &str) -> usize {
        self.files.push((path.to_path_buf(), text.to_string()));
        self.files.len() - 1
    }

    /// A complaint about the node at the end of a trail.
    pub fn add(&mut self, trail: &Trail, wrong: impl Into<String>, right: impl Into<String>) {
        let (file, text) = &self.files[trail.file];
        let (line, column) = super::locate::locate(text, &trail.steps).unwrap_or((1, 1));
        if self.settled.contains(&(trail.file, line)) {
            return;
        }
        self.found.push(Complaint {
            file: file.clone(),
            line,
            column,
            wrong: wrong.into(),
            right: right.into(),
        });
    }

    /// A complaint about a known place in a file.
    pub fn add_place(
        &mut self,
        file: usize,
        (line, column): (usize, usize),
        wrong: impl Into<String>,
        right: impl Into<String>,
    ) {
        let file = self.files[file].0.clone();
        self.found.push(Complaint {
            file,
            line,
            column,
            wrong: wrong.into(),
            right: right.into(),
        });
    }

    /// A complaint about a file as a whole (it cannot be read).
    pub fn add_unread(&mut self, file: &Path, wrong: impl Into<String>, right: impl Into<String>) {
        let (wrong, right) = (wrong.into(), right.into());
        self.found.push(Complaint {
            file: file.to_path_buf(),
            line: 0,
            column: 0,
            wrong,
            right,
        });
    }

    /// Says that a line has had its complaint: what else is found there only follows from it.
    pub fn settle(&mut self, file: usize, line: usize) {
        self.settled.push((file, line));
    }

    /// How many there are so far.
    pub fn count(&self) -> usize {
        self.found.len()
    }

    /// The line of a node, to point from one complaint to another place.
    pub fn line_of(&self, trail: &Trail) -> usize {
        super::locate::locate(&self.files[trail.file].1, &trail.steps).map_or(1, |(line, _)| line)
    }

    pub fn is_empty(&self) -> bool {
        self.found.is_empty()
    }

    /// All complaints in reading order.
    pub fn into_sorted(mut self) -> Vec<Complaint> {
        self.found.sort_by_key(|c| {
            (
                self.files.iter().position(|(path, _)| *path == c.file),
                c.line,
                c.column,
            )
        });
        self.found.dedup();
        self.found
    }
}
