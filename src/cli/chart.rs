//! `trued chart`: what every key sounds.

use super::{Failure, print, print_bytes, read_stage};
use crate::offline::chart::Chart;
use crate::offline::chart_text::sheet;
use crate::offline::tuning_dump::{Slot, tuning_dump};
use crate::stage::complaint::{Complaints, Trail};
use crate::stage::expression::reference;
use crate::stage::node::nearest;
use crate::stage::tunings::{Library, TuningText};
use crate::stage::{Song, Stage};
use crate::tuning::{Pin, TuneError};
use std::io::IsTerminal;
use std::path::{Path, PathBuf};
use std::rc::Rc;

#[derive(clap::Args)]
pub struct Args {
    /// The stage file; its first song unless --song says another
    #[arg(required_unless_present_any = ["tuning", "list"])]
    stage: Option<PathBuf>,
    /// The song, by title
    #[arg(long, value_name = "TITLE", requires = "stage")]
    song: Option<String>,
    /// A tuning by name: shipped, or from a tunings folder
    #[arg(long, value_name = "NAME", conflicts_with = "stage")]
    tuning: Option<String>,
    /// What A4 sounds, or another key: 415, or 'C4 = 256 Hz'
    #[arg(long, value_name = "HZ", requires = "tuning")]
    pitch: Option<String>,
    /// Every tuning there is, by name
    #[arg(long, conflicts_with_all = ["stage", "tuning", "song", "pitch"])]
    list: bool,
    /// A sheet for people, figures for programs, or a tuning dump for synths (into a file)
    #[arg(long, value_enum, default_value = "text")]
    format: Format,
    /// In a tuning dump: the synth's tuning program
    #[arg(long, value_name = "1-128", default_value = "1", value_parser = clap::value_parser!(u8).range(1..=128))]
    program: u8,
    /// In a tuning dump: the bank, for synths that have some
    #[arg(long, value_name = "1-128", value_parser = clap::value_parser!(u8).range(1..=128))]
    bank: Option<u8>,
}

/// Pictures are not made here yet; clap names what is.
#[derive(Clone, Copy, clap::ValueEnum)]
enum Format {
    Text,
    Json,
    Csv,
    Syx,
}

pub fn run(args: Args) -> Result<(), Failure> {
    if args.list {
        return print(&list()?);
    }
    let chart = match (&args.stage, &args.tuning) {
        (Some(path), _) => {
            let stage = read_stage(path)?;
            Chart::of_song(song(&stage, args.song.as_deref())?)
        }
        (None, Some(name)) => of_tuning(name, args.pitch.as_deref())?,
        (None, None) => unreachable!("clap asks for one of the two"),
    };
    match args.format {
        Format::Text => print(&sheet(&chart)),
        Format::Json => print(&chart.json()),
        Format::Csv => print(&chart.csv()),
        Format::Syx => print_dump(&chart, &args),
    }
}

fn print_dump(chart: &Chart, args: &Args) -> Result<(), Failure> {
    if std::io::stdout().is_terminal() {
        let text = "a tuning dump is nothing to read; send it to a file: `trued chart ... --format syx > tuning.syx`";
        return Err(Failure::new(Failure::USAGE, text));
    }
    let slot = Slot {
        bank: args.bank.map(|bank| bank - 1),
        program: args.program - 1,
    };
    print_bytes(&tuning_dump(chart, slot))
}

fn song<'s>(stage: &'s Stage, title: Option<&str>) -> Result<&'s Song, Failure> {
    let Some(title) = title else {
        return (stage.set.first())
            .ok_or_else(|| Failure::new(Failure::DATA, "there is no song in the set"));
    };
    let mut songs = stage.set.iter();
    songs
        .find(|song| song.title.eq_ignore_ascii_case(title))
        .ok_or_else(|| {
            let titles: Vec<&str> = stage.set.iter().map(|song| song.title.as_str()).collect();
            let right = match nearest(title, &titles) {
                Some(near) => format!("did you mean '{near}'?"),
                None => format!("it has: {}", titles.join(", ")),
            };
            Failure::new(
                Failure::USAGE,
                format!("there is no song '{title}' in the set; {right}"),
            )
        })
}

/// Tunings in a folder `tunings` where we stand, the player's own and those shipped.
fn library(complaints: &mut Complaints) -> Library<'static> {
    Library::new(None, Path::new("stage.yaml"), complaints)
}

fn find(name: &str) -> Result<Rc<TuningText>, Failure> {
    let mut complaints = Complaints::default();
    let mut library = library(&mut complaints);
    let names = library.names();
    if !names.iter().any(|known| known == name) {
        let names: Vec<&str> = names.iter().map(String::as_str).collect();
        let right = match nearest(name, &names) {
            Some(near) => format!("did you mean '{near}'?"),
            None => "`trued chart --list` lists those there are".to_string(),
        };
        let text = format!("there is no tuning '{name}'; {right}");
        return Err(Failure::new(Failure::USAGE, text));
    }
    let found = library.find(name, &Trail::default(), &mut complaints);
    found.ok_or_else(|| {
        let lines: Vec<String> = complaints
            .into_sorted()
            .iter()
            .map(|complaint| complaint.to_string())
            .collect();
        Failure::new(Failure::DATA, lines.join("\n"))
    })
}

fn of_tuning(name: &str, pitch: Option<&str>) -> Result<Chart, Failure> {
    let reference = match pitch.map(reference) {
        Some(Ok((key, hertz))) => Some((key, hertz, Pin::Key)),
        Some(Err(mistake)) => {
            let text = format!("--pitch: {}; {}", mistake.wrong, mistake.right);
            return Err(Failure::new(Failure::USAGE, text));
        }
        None => None,
    };
    let found = find(name)?;
    let placement = found.placement(None, None, reference);
    Chart::of_tuning(&found, placement).map_err(|error| {
        let text = match error {
            TuneError::SilentReference(key) => format!(
                "the reference key {key} is silent in {name}; name one that sounds, such as --pitch 'C4 = 262 Hz'"
            ),
            TuneError::NothingSounds => format!("no key sounds in {name}; give it a pitch"),
        };
        Failure::new(Failure::DATA, text)
    })
}

/// Every tuning by name, with what it is about.
fn list() -> Result<String, Failure> {
    let mut complaints = Complaints::default();
    let mut library = library(&mut complaints);
    let names = library.names();
    let width = names
        .iter()
        .map(|name| name.chars().count())
        .max()
        .unwrap_or(0);
    let mut text = String::new();
    for name in names {
        let found = library.find(&name, &Trail::default(), &mut complaints);
        let about = match &found {
            Some(found) => found.about.as_deref().unwrap_or(""),
            None => "(has mistakes in it)",
        };
        text.push_str(format!("{name:width$}  {about}").trim_end());
        text.push('\n');
    }
    Ok(text)
}
