//! `trued rehearse`: a score through the real engine into the listening synth, and what there is to hear.

use super::retune::{Kind, read, read_score, write};
use super::{Failure, called, print, read_stage};
use crate::offline::demo::{self, Scene};
use crate::offline::measure::Sound;
use crate::offline::moments::{self, clock};
use crate::offline::retune::{self, Recording};
use crate::stage::Stage;
use std::path::{Path, PathBuf};

#[derive(clap::Args)]
pub struct Args {
    /// A stage file; without it the built-in demo is played, and written down to be changed
    stage: Option<PathBuf>,
    /// What to play, format 0 or 1; without it score.mid beside the stage file, or the demo's
    #[arg(value_name = "SCORE.mid")]
    score: Option<PathBuf>,
    /// The folder to write to
    #[arg(long, value_name = "DIR", default_value = "rehearsal")]
    out: PathBuf,
    /// Plays on the real synth (not yet)
    #[arg(long)]
    live: bool,
}

pub fn run(args: Args) -> Result<(), Failure> {
    if args.live {
        return Err(Failure::new(
            Failure::USAGE,
            "--live cannot be done yet; leave it out and play the .wav, or use trued run with a keyboard",
        ));
    }
    std::fs::create_dir_all(&args.out).map_err(|error| Failure::unwritten(&args.out, &error))?;
    let stage_path = match &args.stage {
        Some(path) => path.clone(),
        None => write_demo(&args.out)?,
    };
    let beside = stage_path.with_file_name(SCORE);
    let (score_path, file) = match &args.score {
        Some(path) => (path.clone(), read(path)?),
        None if beside.exists() => (beside.clone(), read(&beside)?),
        None => (PathBuf::from("the built-in score"), demo::score()),
    };
    let stage = read_stage(&stage_path)?;
    let score = read_score(&score_path, &file)?;
    print(&format!(
        "Playing {} through the engine with {}, into a built-in synth. Nothing is played aloud.\n\n",
        score_path.display(),
        stage_path.display()
    ))?;
    let recording = retune::play(stage.plan_offline(), &score, 0, 0);
    for (ending, kind) in Kind::ALL {
        let path = output(&args.out, ending);
        write(&path, &kind.make(&recording, &score, &stage)?)?;
    }
    // What is told was measured from the file that will be listened to.
    let wav = output(&args.out, "wav");
    let sound = Sound::read(&wav)
        .map_err(|error| Failure::new(Failure::IO, format!("{}: {error}", wav.display())))?;
    if file == demo::score() {
        let as_written = read(&stage_path)? == demo::STAGE.as_bytes();
        for scene in demo::scenes() {
            print(&scene_line(&scene, as_written, &recording, &stage, &sound))?;
        }
    } else {
        print(&chord_lines(&recording, &stage, &sound))?;
    }
    for notice in recording.notices() {
        eprintln!("{notice}");
    }
    print(&closing(&args.out, &stage_path))
}

const STAGE: &str = "stage.yaml";
const SCORE: &str = "score.mid";

fn output(folder: &Path, ending: &str) -> PathBuf {
    folder.join("rehearsal").with_extension(ending)
}

/// Writes the demo's own files where there are none, and never over somebody's work. Returns the stage file.
fn write_demo(folder: &Path) -> Result<PathBuf, Failure> {
    let files = [
        (folder.join(STAGE), demo::STAGE.as_bytes().to_vec()),
        (folder.join(SCORE), demo::score()),
    ];
    for (path, fresh) in &files {
        if path.exists() && read(path)? != *fresh {
            return Err(Failure::new(
                Failure::USAGE,
                format!(
                    "{path} has been changed, and is kept. To hear it as it is now: {trued} rehearse {stage}\n\
                     To hear the demo as it was: {trued} rehearse --out another-folder",
                    path = path.display(),
                    trued = called(),
                    stage = files[0].0.display()
                ),
            ));
        }
    }
    for (path, fresh) in &files {
        write(path, fresh)?;
    }
    let [(stage, _), _] = files;
    Ok(stage)
}

fn scene_line(
    scene: &Scene,
    as_written: bool,
    recording: &Recording,
    stage: &Stage,
    sound: &Sound,
) -> String {
    let note = recording
        .notes
        .iter()
        .find(|note| moments::seconds(note.time) >= scene.from_s - 0.001);
    let song = note.map_or(String::new(), |note| song_name(stage, note.song));
    let found: Vec<String> = scene
        .checks
        .iter()
        .filter_map(|check| check.measure(recording, sound))
        .map(|finding| finding.to_string())
        .collect();
    let listen = match as_written {
        true => format!(": {}", scene.listen),
        false => String::new(),
    };
    let measured = match found.is_empty() {
        true => "nothing: these keys do not sound here".to_string(),
        false => found.join("; "),
    };
    format!(
        "{:>5}  {} ({song}){listen}. Measured: {measured}.\n",
        clock(scene.from_s),
        scene.what
    )
}

fn chord_lines(recording: &Recording, stage: &Stage, sound: &Sound) -> String {
    let chords = moments::chords(recording);
    if chords.is_empty() {
        return "No two notes sound together for most of a second, so there is nothing to measure.\n"
            .into();
    }
    chords
        .iter()
        .map(|chord| {
            let keys: Vec<String> = chord.keys.iter().map(|key| key.to_string()).collect();
            let found: Vec<String> = chord
                .pairs
                .iter()
                .filter_map(|pair| pair.measure(recording, sound))
                .map(|found| found.to_string())
                .collect();
            let measured = match found.is_empty() {
                true => String::new(),
                false => format!(" Measured: {}.", found.join("; ")),
            };
            let song = song_name(stage, chord.song);
            let keys = keys.join(" ");
            format!("{:>5}  {keys} ({song}).{measured}\n", clock(chord.from_s))
        })
        .collect()
}

fn song_name(stage: &Stage, song: u16) -> String {
    match stage.set.get(song as usize) {
        Some(song) => format!("{}, {}", song.title, song.tuning_name),
        None => String::new(),
    }
}

fn closing(folder: &Path, stage: &Path) -> String {
    let (folder, stage, trued) = (folder.display(), stage.display(), called());
    format!(
        "\nWritten: {folder}/rehearsal.wav to listen to, .svg to look at, .mid and .jsonl for other programs.\n\
         Volume down, then play {folder}/rehearsal.wav.\n\
         Change one word in {stage}, then: {trued} rehearse {stage}\n\
         With a keyboard: {trued} ports --stage > evening.yaml\n"
    )
}
