//! A whole stage file: its sections in order, then the plan.

use super::advice::Findings;
use super::complaint::{Complaint, Complaints, Trail};
use super::naming::Scene;
use super::node::{At, Fields, Node};
use super::resolve::Names;
use super::rig::{self, Rig, Sections};
use super::songs::{self, Desk, Entry};
use super::told::Told;
use super::tunings::{Library, Reference};
use super::values::choice;
use super::{Stage, cues, defaults, lamps, outlook, placing, pools, slips};
use crate::engine::Plan;
use crate::engine::plan::{CuePlan, PartPlan};
use crate::pitch::{Interval, Pitch};
use std::path::{Path, PathBuf};

/// What the top of the file says for the whole evening.
struct Evening {
    name: String,
    pitch: Option<Reference>,
    programs_from: u8,
    edits_at_once: bool,
}

/// What is read after the rig.
struct Rest {
    entries: Vec<Entry>,
    parts: Vec<PartPlan>,
    cues: Vec<CuePlan>,
    lamps: lamps::Lamps,
    told: Told,
    advice: Vec<String>,
    files: Vec<PathBuf>,
    texts: Vec<String>,
}

/// Reads a text as a stage file; the files that it names are read from `kept`, or from the disk if that is empty.
///
/// # Errors
/// Every complaint at once.
pub fn parse(path: &Path, text: &str, kept: &[(PathBuf, String)]) -> Result<Stage, Vec<Complaint>> {
    let mut found = Findings {
        complaints: Complaints::reading(kept),
        ..Findings::default()
    };
    let file = found.complaints.add_file(path, text);
    let stage = slips::read_tree(file, text, &mut found.complaints)
        .and_then(|tree| read(path, &At::new(&tree, Trail::root(file)), &mut found));
    match stage {
        Some(stage) if found.complaints.is_empty() => Ok(stage),
        _ => Err(found.complaints.into_sorted()),
    }
}

fn read(path: &Path, top: &At<'_>, found: &mut Findings) -> Option<Stage> {
    let wanted = "a map that begins with `stage: First light`";
    let mut fields = top.fields(wanted, &mut found.complaints)?;
    let mut files = vec![path.to_path_buf()];
    let evening = evening(path, &mut fields, found);
    let rig = read_rig(path, &mut fields, &mut files, found);
    let mut library = Library::new(fields.take("tunings"), path, &mut found.complaints);
    library.check_own(&mut found.complaints);
    let (book, set) = (fields.take("songs"), fields.take("set"));
    let mut desk = Desk {
        rig: &rig,
        tunings: &mut library,
        pitch: evening.pitch,
        programs_from: evening.programs_from,
        found,
        placed: Vec::new(),
        by_hand: Vec::new(),
        told: Told::default(),
        titles: Vec::new(),
        book_is_lost: false,
    };
    let mut entries = songs::read(book.as_ref(), set.as_ref(), top, &mut desk);
    let (told, titles) = (desk.told, desk.titles);
    let scene = Scene {
        rig: &rig,
        names: Names {
            titles: titles.iter().map(String::as_str).collect(),
            synths: (rig.synths.iter())
                .map(|synth| synth.device.name.as_str())
                .collect(),
            references: (entries.iter()).map(|entry| entry.plan.reference).collect(),
            told: &told,
        },
        programs_from: evening.programs_from,
    };
    let cues = fields.take("cues");
    let cues = cues.map_or_else(Vec::new, |at| cues::read(&at, &scene, found));
    let lamps = fields.take("lamps");
    let lamps = lamps.map_or_else(Default::default, |at| lamps::read(&at, &scene, found));
    fields.finish(&mut found.complaints);
    let mut parts = pools::allot(&rig.parts, &rig, &mut found.complaints);
    pools::share_managers(&rig, &mut parts, &mut entries);
    let advice = entries.iter().flat_map(|entry| entry.song.advice());
    advice.for_each(|line| found.advise(line));
    files.extend_from_slice(library.files());
    let texts = found.complaints.texts(&files);
    let rest = Rest {
        entries,
        parts,
        cues,
        lamps,
        told,
        advice: std::mem::take(&mut found.advice),
        files,
        texts,
    };
    Some(assemble(evening, rig, rest))
}

fn assemble(evening: Evening, rig: Rig, rest: Rest) -> Stage {
    let (set, songs) = (rest.entries.into_iter())
        .map(|entry| (entry.song, entry.plan))
        .unzip();
    let (keyboards, keyboard_plans) = (rig.keyboards.into_iter())
        .map(|keyboard| (keyboard.device, keyboard.plan))
        .unzip();
    let (synths, synth_plans) = (rig.synths.into_iter())
        .map(|synth| (synth.device, synth.plan))
        .unzip();
    let mut stage = Stage {
        name: evening.name,
        keyboards,
        synths,
        set,
        advice: rest.advice,
        files: rest.files,
        texts: rest.texts,
        told: rest.told,
        plan: Plan {
            keyboards: keyboard_plans,
            synths: synth_plans,
            parts: rest.parts,
            set: songs,
            cues: rest.cues,
            lamps: rest.lamps.plans,
            lamp_ports: rest.lamps.ports,
            edits_at_once: evening.edits_at_once,
            plain_offset: evening.pitch.map_or(Interval::ZERO, |(key, hertz, _)| {
                hertz.pitch() - Pitch::of_key(key.number())
            }),
        },
    };
    let short = outlook::short_reach(&stage.plan);
    stage.advice.extend(short);
    stage
}

fn evening(path: &Path, fields: &mut Fields<'_>, found: &mut Findings) -> Evening {
    let complaints = &mut found.complaints;
    let from_file = || {
        path.file_stem()
            .map_or_else(String::new, |stem| stem.to_string_lossy().into())
    };
    let name = fields
        .take("stage")
        .and_then(|at| at.text("a name for the evening", complaints));
    let pitch = fields
        .take("pitch")
        .and_then(|at| placing::pitch(&at, complaints));
    let programs_from = fields
        .take("programs_from")
        .and_then(|at| at.whole("where programs begin", 0..=1, complaints));
    const EDITS: [(&str, bool); 2] = [("at-next-song", false), ("at-once", true)];
    let edits = fields
        .take("edits")
        .and_then(|at| choice(&at, &EDITS, complaints));
    Evening {
        name: name.unwrap_or_else(from_file),
        pitch,
        programs_from: programs_from.map_or(defaults::PROGRAMS_FROM, |from| from as u8),
        edits_at_once: edits.unwrap_or(false),
    }
}

/// `keyboards`, `synths` and `parts`, here or in the file that `rig` names.
fn read_rig(
    path: &Path,
    fields: &mut Fields<'_>,
    files: &mut Vec<PathBuf>,
    found: &mut Findings,
) -> Rig {
    let mut sections = take_sections(fields);
    if let Some(at) = fields.take("leave") {
        sections.leave = rig::leave(&at, &mut found.complaints).unwrap_or_default();
    }
    let Some(at) = fields.take("rig") else {
        return rig::read(&sections, found);
    };
    let Some((tree, file)) = rig_file(path, &at, files, found) else {
        return rig::read(&sections, found);
    };
    let there = At::new(&tree, Trail::root(file));
    let wanted = "a map with keyboards, synths and parts";
    let Some(mut fields) = there.fields(wanted, &mut found.complaints) else {
        return rig::read(&sections, found);
    };
    let theirs = take_sections(&mut fields);
    fields.finish(&mut found.complaints);
    let pairs = [
        (&mut sections.keyboards, theirs.keyboards),
        (&mut sections.synths, theirs.synths),
        (&mut sections.parts, theirs.parts),
    ];
    for (here, theirs) in pairs {
        if let (Some(here), Some(_)) = (&here, &theirs) {
            found.complaints.add(
                &here.trail,
                "this section stands in the rig file too",
                "keep it in one of the two files",
            );
        }
        *here = theirs.or(here.take());
    }
    rig::read(&sections, found)
}

fn take_sections<'n>(fields: &mut Fields<'n>) -> Sections<'n> {
    Sections {
        keyboards: fields.take("keyboards"),
        synths: fields.take("synths"),
        parts: fields.take("parts"),
        ..Sections::default()
    }
}

/// The tree of the rig file; its path goes from the stage file's folder.
fn rig_file(
    path: &Path,
    at: &At<'_>,
    files: &mut Vec<PathBuf>,
    found: &mut Findings,
) -> Option<(Node, usize)> {
    let name = at.text("the path of a rig file", &mut found.complaints)?;
    let file = path.parent().unwrap_or(Path::new("")).join(&name);
    files.push(file.clone());
    match found.complaints.read(&file) {
        Ok(text) => {
            let number = found.complaints.add_file(&file, &text);
            let tree = slips::read_tree(number, &text, &mut found.complaints)?;
            Some((tree, number))
        }
        Err(error) => {
            let why = match error.kind() {
                std::io::ErrorKind::NotFound => String::from("is not there"),
                _ => format!("cannot be read ({error})"),
            };
            found.complaints.add(
                &at.trail,
                format!("the rig file {name} {why}"),
                "give its path from the folder of this stage file",
            );
            None
        }
    }
}
