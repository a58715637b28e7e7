//! Chorales and analyses, read by `export.py` once and kept under `target/`.

use super::keyboard::{Music, QUARTER_S, Touch};
use serde::Deserialize;
use serde::de::DeserializeOwned;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::sync::Mutex;
use std::{env, fs, process};

/// Which pieces: `START:STEP:COUNT` over the sorted file names.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Take {
    /// The pieces of the published table; to report.
    Test,
    /// None of those; to tune by.
    Dev,
}

impl Take {
    fn words(self) -> &'static str {
        match self {
            Take::Test => "0:10:40",
            Take::Dev => "5:10:40",
        }
    }
}

#[derive(Debug, Deserialize)]
pub struct Piece {
    pub name: String,
    /// By name, as music21 finds it.
    pub tonic: String,
    pub notes: Vec<Note>,
}

/// A piece as it is printed, its key not looked for.
#[derive(Debug, Deserialize)]
pub struct Printed {
    /// Among the sorted file names.
    pub place: usize,
    pub name: String,
    pub notes: Vec<Note>,
}

#[derive(Debug, Deserialize)]
pub struct Note {
    pub key: u8,
    /// `Bb`.
    pub name: String,
    pub on: Fraction,
    pub off: Fraction,
    performed_s: [f64; 2],
}

/// Whole quarters over how many.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
pub struct Fraction(i64, i64);

impl Fraction {
    pub fn quarters(self) -> f64 {
        self.0 as f64 / self.1 as f64
    }
}

/// Time between two edges of notes in an analysed chorale.
#[derive(Debug, Deserialize)]
pub struct Slice {
    pub quarters: Fraction,
    pub keys: Vec<u8>,
    /// The annotated root as a pitch class; none before the first annotation.
    pub root: Option<u8>,
    /// The pitch classes of the annotated chord.
    pub chord: Vec<u8>,
}

#[derive(Debug, Deserialize)]
pub struct Analysis {
    pub slices: Vec<Slice>,
}

/// How the voices come in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Manner {
    /// All at once, as printed.
    Together,
    /// As hands would: onsets up to 30 ms late, releases 30 ms early or late, the same in every run.
    Performed,
}

impl Note {
    pub fn touch(&self, manner: Manner) -> Touch {
        let [on_s, off_s] = match manner {
            Manner::Together => [self.on, self.off].map(|at| at.quarters() * QUARTER_S),
            Manner::Performed => self.performed_s,
        };
        Touch {
            on_s,
            off_s,
            key: self.key,
        }
    }
}

pub fn music(notes: &[Note], manner: Manner) -> Music {
    Music::without_pedal(notes.iter().map(|note| note.touch(manner)).collect())
}

impl Piece {
    pub fn music(&self, manner: Manner) -> Music {
        music(&self.notes, manner)
    }
}

pub fn chorales(take: Take) -> Vec<Piece> {
    read(&["chorales", take.words()])
}

/// All chorales in four voices.
pub fn printed() -> Vec<Printed> {
    read(&["printed"])
}

pub fn analyses() -> Vec<Analysis> {
    read(&["analyses"])
}

/// One at a time: several tests want the same file.
static READING: Mutex<()> = Mutex::new(());

fn read<T: DeserializeOwned>(words: &[&str]) -> T {
    let _one = READING.lock();
    let file = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join(file_name(words));
    if !file.exists() {
        let half = file.with_extension(process::id().to_string());
        export(words, &half);
        fs::rename(&half, &file).expect("the new file in its place");
    }
    let text = fs::read_to_string(&file).expect("the file that was there");
    serde_json::from_str(&text).unwrap_or_else(|error| panic!("{}: {error}", file.display()))
}

/// Another exporter or other packages make another file.
fn file_name(words: &[&str]) -> String {
    const MAKERS: [&str; 2] = [include_str!("export.py"), include_str!("requirements.txt")];
    // FNV-1a.
    let mut hash = 0xCBF2_9CE4_8422_2325_u64;
    for byte in MAKERS.iter().flat_map(|text| text.bytes()) {
        hash = (hash ^ byte as u64).wrapping_mul(0x100_0000_01B3);
    }
    format!("{}-{hash:016x}.json", words.join("-").replace(':', "-"))
}

fn export(words: &[&str], out: &Path) {
    let output = Command::new(python())
        .arg(script())
        .args(words)
        .arg(out)
        .output()
        .expect("python starts");
    let said = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "export.py {words:?}: {said}");
}

fn script() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/outside/adaptive/export.py")
}

/// The one that `tests/setup` made or found.
pub fn python() -> PathBuf {
    let target = Path::new(env!("CARGO_TARGET_TMPDIR")).parent();
    let own = target.expect("a target folder").join("music21/bin/python");
    let ready = |python: &PathBuf| {
        let check = Command::new(python).arg(script()).arg("check").output();
        check.is_ok_and(|output| output.status.success())
    };
    [own, "python3".into()]
        .into_iter()
        .find(ready)
        .expect("no Python has the right music21; run `sh tests/setup --tests`")
}
