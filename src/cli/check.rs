//! `trued check`: what is wrong with a stage file, or what to expect of it.

use super::{Failure, print};
use crate::stage::complaint::Complaint;
use crate::stage::outlook::{self, SynthOutlook};
use crate::stage::{Device, Song, Stage, Wish, defaults};
use serde_json::{Value, json};
use std::fmt::Write;
use std::path::PathBuf;

#[derive(clap::Args)]
pub struct Args {
    /// The stage file
    #[arg(required_unless_present = "defaults")]
    stage: Option<PathBuf>,
    /// One JSON object instead of lines for people
    #[arg(long)]
    json: bool,
    /// Advice counts as a mistake (exit code 65)
    #[arg(long)]
    strict: bool,
    /// Everything that is so unless the file says otherwise
    #[arg(long)]
    defaults: bool,
}

pub fn run(args: Args) -> Result<(), Failure> {
    let table = if args.defaults {
        defaults::table()
    } else {
        Vec::new()
    };
    let Some(path) = &args.stage else {
        return print(&match args.json {
            true => lines_of(&json!({ "defaults": defaults_json(&table) })),
            false => defaults_text(&table),
        });
    };
    std::fs::File::open(path).map_err(|error| Failure::unread(path, &error))?;
    let read = Stage::read(path);
    if args.json {
        let mut told = match &read {
            Ok(stage) => stage_json(stage),
            Err(complaints) => json!({ "complaints": complaints_json(complaints) }),
        };
        if args.defaults {
            told["defaults"] = defaults_json(&table);
        }
        print(&lines_of(&told))?;
    } else {
        let told = read.as_ref().map(stage_text).unwrap_or_default();
        print(&format!("{told}{}", defaults_text(&table)))?;
    }
    match read {
        Err(complaints) => Err(Failure::new(Failure::DATA, complaint_text(&complaints))),
        Ok(stage) if args.strict && !stage.advice.is_empty() => Err(Failure::new(
            Failure::DATA,
            format!(
                "{}: there is advice, and --strict was asked for",
                path.display()
            ),
        )),
        Ok(_) => Ok(()),
    }
}

fn lines_of(value: &Value) -> String {
    format!("{value:#}\n")
}

/// Every complaint a line, and how many.
fn complaint_text(complaints: &[Complaint]) -> String {
    let mut lines: Vec<String> = complaints.iter().map(ToString::to_string).collect();
    if complaints.len() > 1 {
        lines.push(format!("{} mistakes", complaints.len()));
    }
    lines.join("\n")
}

fn complaints_json(complaints: &[Complaint]) -> Value {
    let complaint = |complaint: &Complaint| {
        json!({
            "file": complaint.file.display().to_string(),
            "line": complaint.line,
            "column": complaint.column,
            "wrong": complaint.wrong,
            "right": complaint.right,
        })
    };
    complaints.iter().map(complaint).collect()
}

/// Writing to a text cannot fail.
fn line(text: &mut String, words: std::fmt::Arguments<'_>) {
    let _ = writeln!(text, "{words}");
}

fn stage_text(stage: &Stage) -> String {
    let mut text = String::new();
    line(&mut text, format_args!("{}: no mistakes", stage.name));
    text.push_str("\nsongs\n");
    let plan = stage.plan();
    for (index, song) in stage.set.iter().enumerate() {
        let before = &stage.set[..index];
        match before.iter().position(|other| other.title == song.title) {
            Some(first) => line(
                &mut text,
                format_args!("  {}  {} (as {})", index + 1, song.title, first + 1),
            ),
            None => {
                let more = [
                    outlook::intonation(&plan, index),
                    outlook::crowding(&plan, index),
                ];
                song_text(&mut text, index + 1, song, more.into_iter().flatten());
            }
        }
    }
    text.push_str("\nkeyboards\n");
    for (keyboard, played) in stage.keyboards.iter().zip(&plan.keyboards) {
        let fingers = match played.sends_mpe() {
            true => ", each note on a channel of its own",
            false => "",
        };
        line(
            &mut text,
            format_args!("  {}: {}{fingers}", keyboard.name, wish(keyboard, true)),
        );
    }
    text.push_str("\nsynths\n");
    for (synth, outlook) in stage.synths.iter().zip(outlook::synths(&plan)) {
        synth_text(&mut text, synth, &outlook);
    }
    if !stage.advice.is_empty() {
        text.push_str("\nadvice\n");
    }
    for advice in &stage.advice {
        line(&mut text, format_args!("  {advice}"));
    }
    text
}

fn song_text(text: &mut String, number: usize, song: &Song, more: impl Iterator<Item = String>) {
    let about = song.tuning_about.as_deref();
    let about = about.map_or(String::new(), |about| format!(": {about}"));
    line(text, format_args!("  {number}  {}", song.title));
    line(text, format_args!("     {}{about}", song.tuning_name));
    line(text, format_args!("     {}", song.c4()));
    for fifth in song.circle() {
        line(text, format_args!("     {fifth}"));
    }
    if let Some(keys) = song.good_keys() {
        line(text, format_args!("     {keys}"));
    }
    for (named, pairs) in song.pairs() {
        for pair in pairs {
            line(text, format_args!("     in {named}: {pair}"));
        }
    }
    for more in more {
        line(text, format_args!("     {more}"));
    }
}

fn synth_text(text: &mut String, synth: &Device, outlook: &SynthOutlook) {
    line(
        text,
        format_args!(
            "  {}: {}; {}, bend range {}, notes on channels {}; pitch within {:.3} c",
            synth.name,
            wish(synth, false),
            outlook.dialect,
            outlook.bend_range,
            outlook.channels_spelt,
            outlook.worst_rounding.cents(),
        ),
    );
}

fn wish(device: &Device, keyboard: bool) -> String {
    match &device.port {
        Wish::Any if keyboard => String::from("every input port that fits"),
        Wish::Any => String::from("the first output port that fits"),
        Wish::Virtual => format!("a port of our own, `{}`", device.name),
        Wish::Named { globs, socket } => {
            let socket = socket
                .as_ref()
                .map_or(String::new(), |socket| format!(" at {socket}"));
            format!("the first port named {}{socket}", globs.join(" or "))
        }
    }
}

fn stage_json(stage: &Stage) -> Value {
    let plan = stage.plan();
    let songs = stage.set.iter().enumerate();
    let songs: Vec<Value> = songs
        .map(|(index, song)| {
            let mut told = song_json(song);
            told["intonation"] = outlook::intonation(&plan, index).into();
            told["crowding"] = outlook::crowding(&plan, index).into();
            told
        })
        .collect();
    let synths = stage.synths.iter().zip(outlook::synths(&plan));
    let synths: Vec<Value> = synths
        .map(|(synth, outlook)| synth_json(synth, &outlook))
        .collect();
    let files: Vec<String> = stage
        .files
        .iter()
        .map(|file| file.display().to_string())
        .collect();
    json!({
        "stage": stage.name,
        "files": files,
        "complaints": [],
        "advice": stage.advice,
        "songs": songs,
        "synths": synths,
    })
}

fn song_json(song: &Song) -> Value {
    let pairs = song.pairs().into_iter().flat_map(|(key, pairs)| {
        pairs.into_iter().map(move |pair| {
            json!({
                "in": key,
                "low": pair.low.to_string(),
                "high": pair.high.to_string(),
                "cents": pair.size.cents(),
                "from_pure_cents": pair.from_pure.cents(),
            })
        })
    });
    json!({
        "title": song.title,
        "tuning": song.tuning_name,
        "about": song.tuning_about,
        "c4": song.c4(),
        "circle": song.circle(),
        "good_keys": song.good_keys(),
        "pairs": pairs.collect::<Vec<Value>>(),
    })
}

fn synth_json(synth: &Device, outlook: &SynthOutlook) -> Value {
    json!({
        "name": synth.name,
        "dialect": outlook.dialect,
        "bend_range": outlook.bend_range,
        "channels": outlook.channels,
        "worst_rounding_cents": outlook.worst_rounding.cents(),
    })
}

fn defaults_text(table: &[defaults::Default]) -> String {
    let mut text = String::new();
    let mut section = None;
    for row in table {
        if section != Some(row.section) {
            section = Some(row.section);
            let name = if row.section.is_empty() {
                "at the top"
            } else {
                row.section
            };
            line(&mut text, format_args!("\n{name}"));
        }
        let meaning = match row.meaning {
            "" => String::new(),
            meaning => format!("   # {meaning}"),
        };
        line(
            &mut text,
            format_args!("  {}: {}{meaning}", row.key, row.value),
        );
    }
    text.trim_start_matches('\n').to_string()
}

fn defaults_json(table: &[defaults::Default]) -> Value {
    let row = |row: &defaults::Default| {
        json!({
            "section": row.section,
            "key": row.key,
            "value": row.value,
            "meaning": row.meaning,
        })
    };
    table.iter().map(row).collect()
}
