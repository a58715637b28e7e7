//! `trued retune`: a MIDI file through the engine into files.

use super::{Failure, read_stage};
use crate::offline::retune::{self, Recording};
use crate::offline::score_file::Score;
use crate::offline::{listen, notes_file, picture};
use crate::stage::Stage;
use std::io::Cursor;
use std::path::{Path, PathBuf};

#[derive(clap::Args)]
pub struct Args {
    /// The stage file
    stage: PathBuf,
    /// The MIDI file to play, format 0 or 1
    #[arg(value_name = "IN.mid")]
    score: PathBuf,
    /// Where to write; the ending says what: .mid .wav .svg .jsonl
    #[arg(value_name = "OUT", required = true)]
    out: Vec<PathBuf>,
    /// The song to begin with, instead of the first of the set
    #[arg(long, value_name = "TITLE")]
    song: Option<String>,
    /// The keyboard it is played on, instead of the first
    #[arg(long, value_name = "KEYBOARD")]
    from: Option<String>,
}

pub fn run(args: Args) -> Result<(), Failure> {
    let kinds = args
        .out
        .iter()
        .map(|path| Kind::of(path))
        .collect::<Result<Vec<Kind>, Failure>>()?;
    let stage = read_stage(&args.stage)?;
    let file = read(&args.score)?;
    let score = read_score(&args.score, &file)?;
    let song = match &args.song {
        Some(title) => find_song(&stage, title)?,
        None => 0,
    };
    let keyboard = match &args.from {
        Some(name) => find_keyboard(&stage, name)?,
        None => 0,
    };
    let recording = retune::play(stage.plan_offline(), &score, song, keyboard);
    for (path, kind) in args.out.iter().zip(kinds) {
        write(path, &kind.make(&recording, &score, &stage)?)?;
    }
    for notice in recording.notices() {
        eprintln!("{notice}");
    }
    Ok(())
}

/// What a file's ending asks for.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    Midi,
    Wav,
    Picture,
    Notes,
}

impl Kind {
    /// All of them, by ending.
    pub(super) const ALL: [(&str, Kind); 4] = [
        ("mid", Kind::Midi),
        ("wav", Kind::Wav),
        ("svg", Kind::Picture),
        ("jsonl", Kind::Notes),
    ];

    fn of(path: &Path) -> Result<Kind, Failure> {
        let ending = path
            .extension()
            .map(|ending| ending.to_string_lossy().to_lowercase());
        let known = |(name, _): &&(&str, Kind)| ending.as_deref() == Some(*name);
        match Kind::ALL.iter().find(known) {
            Some((_, kind)) => Ok(*kind),
            None => Err(Failure::new(
                Failure::USAGE,
                format!(
                    "{}: its ending does not say what to write; end it in .mid, .wav, .svg or .jsonl",
                    path.display()
                ),
            )),
        }
    }

    /// The file's whole content.
    pub(super) fn make(
        self,
        recording: &Recording,
        score: &Score<'_>,
        stage: &Stage,
    ) -> Result<Vec<u8>, Failure> {
        Ok(match self {
            Kind::Midi => recording
                .midi_file(score)
                .map_err(|why| Failure::new(Failure::DATA, why))?,
            Kind::Wav => {
                let mut file = Cursor::new(Vec::new());
                listen::write_wav(&listen::render(recording), &mut file)
                    .map_err(|why| Failure::new(Failure::IO, why.to_string()))?;
                file.into_inner()
            }
            Kind::Picture => {
                let titles: Vec<String> = stage.set.iter().map(|s| s.title.clone()).collect();
                picture::draw(recording, &titles).into_bytes()
            }
            Kind::Notes => notes_file::write(recording).into_bytes(),
        })
    }
}

pub(super) fn read(path: &Path) -> Result<Vec<u8>, Failure> {
    std::fs::read(path).map_err(|error| Failure::unread(path, &error))
}

pub(super) fn write(path: &Path, bytes: &[u8]) -> Result<(), Failure> {
    std::fs::write(path, bytes).map_err(|error| Failure::unwritten(path, &error))
}

pub(super) fn read_score<'a>(path: &Path, file: &'a [u8]) -> Result<Score<'a>, Failure> {
    Score::read(file)
        .map_err(|why| Failure::new(Failure::DATA, format!("{}: {why}", path.display())))
}

fn find_song(stage: &Stage, title: &str) -> Result<u16, Failure> {
    let titles = || stage.set.iter().map(|song| song.title.as_str());
    let place = titles().position(|known| known.eq_ignore_ascii_case(title));
    place.map(|place| place as u16).ok_or_else(|| {
        Failure::new(
            Failure::USAGE,
            format!(
                "there is no song '{title}' in the set; it has: {}",
                titles().collect::<Vec<_>>().join(", ")
            ),
        )
    })
}

fn find_keyboard(stage: &Stage, name: &str) -> Result<usize, Failure> {
    let names = || stage.keyboards.iter().map(|device| device.name.as_str());
    let place = names().position(|known| known == name);
    place.ok_or_else(|| {
        Failure::new(
            Failure::USAGE,
            format!(
                "there is no keyboard '{name}' in the stage file; it has: {}",
                names().collect::<Vec<_>>().join(", ")
            ),
        )
    })
}
