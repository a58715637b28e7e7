//! How things stand, in plain sentences and as one object with stable names.

use super::by_hand;
use crate::engine::Report;
use crate::engine::plan::NameId;
use crate::pitch::Interval;
use crate::ports::Server;
use crate::stage::Stage;
use serde_json::{Value, json};
use std::path::Path;

/// What the desk knows. The desk keeps it; nobody else is asked.
#[derive(Clone, Debug)]
pub struct Status {
    /// What this daemon is called.
    pub name: String,
    pub backend: String,
    /// The stage's name, and where it was read.
    pub stage: String,
    pub file: String,
    /// What is wrong with the file as it lies there now, while an earlier text plays.
    pub complaint: Option<String>,
    /// What was taken up from before the restart, or why nothing was; until something changes.
    pub resumed: Option<String>,
    /// That text is the copy of the last good one, because the file was bad when the daemon started.
    pub from_copy: bool,
    /// Good edits that came into force.
    pub reloads: u64,
    /// Titles in the order of the set.
    pub titles: Vec<String>,
    /// What the places of keys are called.
    pub places: Vec<(NameId, String)>,
    pub keyboards: Vec<Device>,
    pub synths: Vec<Device>,
    pub report: Report,
    /// Lost before the engine saw it.
    pub overruns: u64,
    pub too_long: u64,
    /// Cycles after which something waited for a full port, and what was left out because it stayed full.
    pub waited: u64,
    pub dropped: u64,
    pub real_time: bool,
    pub server: Server,
}

/// A keyboard or synth of the stage file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Device {
    pub name: String,
    /// The ports it is connected to.
    pub ports: Vec<String>,
    pub waits: Waits,
    /// The score thread has a way to it (synths).
    pub linked: bool,
}

/// What a device waits for while it is not connected.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Waits {
    /// A port of ours: others connect to it.
    ForOthers,
    For(String),
}

impl Status {
    /// As an evening begins, with nothing connected yet.
    pub fn of(stage: &Stage, name: &str, backend: &str, file: &Path, report: Report) -> Status {
        Status {
            name: name.to_string(),
            backend: backend.to_string(),
            stage: stage.name.clone(),
            file: file.display().to_string(),
            complaint: None,
            resumed: None,
            from_copy: false,
            reloads: 0,
            titles: stage.set.iter().map(|song| song.title.clone()).collect(),
            places: stage.place_names(),
            keyboards: Vec::new(),
            synths: Vec::new(),
            report,
            overruns: 0,
            too_long: 0,
            waited: 0,
            dropped: 0,
            real_time: false,
            server: Server::default(),
        }
    }

    /// Everything on one screen, a sentence a line.
    pub fn text(&self, uptime_s: u64) -> String {
        let mut lines = self.sentences();
        lines.extend(by_hand::chord(&self.report.standing));
        lines.extend(by_hand::by_chord(&self.report));
        let priority = if self.real_time {
            "with real-time priority."
        } else {
            "without real-time priority: notes may be late on a busy machine."
        };
        lines.push(format!(
            "{} has been up for {} on {}, {priority}",
            self.name,
            duration(uptime_s),
            self.backend
        ));
        lines.join("\n") + "\n"
    }

    /// As one object. Names and types stay; more may come.
    pub fn json(&self, uptime_s: u64) -> Value {
        let song = |index: usize| {
            let title = self.titles.get(index)?;
            Some(json!({"number": index + 1, "title": title}))
        };
        let now = usize::from(self.report.song);
        let counters: serde_json::Map<String, Value> = self
            .counters()
            .iter()
            .map(|counter| (counter.name.to_string(), counter.count.into()))
            .collect();
        json!({
            "name": self.name,
            "backend": self.backend,
            "stage": self.stage,
            "file": self.file,
            "complaint": self.complaint,
            "resumed": self.resumed,
            "from_copy": self.from_copy,
            "reloads": self.reloads,
            "song": song(now),
            "next": song(now + 1),
            "armed": self.report.armed_song.and_then(|place| song(usize::from(place))),
            "armed_cues": self.report.armed,
            "pitch_nudge_cents": cents(self.report.nudge),
            "transpose_keys": self.report.transpose_keys,
            "plain": self.report.plain,
            "tonic": by_hand::tonic(&self.report),
            "waits_for_key": self.report.waits_for_key,
            "inflections": by_hand::inflections(&self.report, &self.places),
            "black_keys": by_hand::black_keys(&self.report),
            "black_keys_now": by_hand::black_keys_now(&self.report),
            "by_chord": self.report.by_chord,
            "root": self.report.standing.chord.root,
            "shape": by_hand::shape(&self.report.standing),
            "anchor_cents": self.report.standing.anchor.map(cents),
            "drift_cents": cents(self.report.standing.drift),
            "root_held": self.report.root_held,
            "songs": self.titles.len(),
            "keyboards": devices(&self.keyboards),
            "synths": devices(&self.synths),
            "keys_held": self.report.voices,
            "notes": self.report.counters.notes,
            "counters": counters,
            "uptime_s": uptime_s,
            "real_time": self.real_time,
            "trouble": self.trouble(),
        })
    }

    /// The sentences that were not so before; what is no longer to be said is left out.
    pub fn changes(&self, before: &Status) -> Vec<String> {
        let old = before.sentences();
        let new = self.sentences().into_iter();
        let mut lines: Vec<String> = new.filter(|sentence| !old.contains(sentence)).collect();
        if before.complaint.is_some() && self.complaint.is_none() {
            lines.push(format!("{} is in order again.", self.file));
        }
        lines
    }

    /// For a supervisor's one line.
    pub fn line(&self) -> String {
        let count = |devices: &[Device], what: &str| {
            let connected = devices.iter().filter(|device| device.is_connected());
            format!(
                "{} of {} {what} connected",
                connected.count(),
                devices.len()
            )
        };
        let complaint = if self.complaint.is_some() {
            "; the stage file has mistakes and an earlier text plays"
        } else {
            ""
        };
        let trouble = self
            .trouble()
            .map_or(String::new(), |trouble| format!("; {trouble}"));
        format!(
            "{}; {}, {}{complaint}{trouble}",
            self.song_shown(),
            count(&self.keyboards, "keyboards"),
            count(&self.synths, "synths")
        )
    }

    /// `song 2 of 5: Ballad`.
    pub fn song_shown(&self) -> String {
        let place = usize::from(self.report.song);
        let title = self.titles.get(place).map_or("", String::as_str);
        format!("song {} of {}: {title}", place + 1, self.titles.len())
    }

    /// What is wrong with the way to all ports.
    fn trouble(&self) -> Option<&'static str> {
        match self.server {
            Server::Runs => None,
            Server::Absent => Some("no JACK server answers; waiting for one"),
            Server::StandsStill => {
                Some("the JACK server stands still; nothing is heard or sent until it goes on")
            }
        }
    }

    /// Each stands for a thing that can change by itself.
    fn sentences(&self) -> Vec<String> {
        let mut out = vec![format!("{} is the stage, from {}.", self.stage, self.file)];
        out.extend(self.trouble().map(|trouble| format!("Trouble: {trouble}.")));
        if let Some(complaint) = &self.complaint {
            let plays = match self.from_copy {
                true => "the copy kept of its last good text plays",
                false => "an earlier text plays",
            };
            out.push(format!("The file has mistakes, so {plays}: {complaint}"));
        }
        let next = match self.titles.get(usize::from(self.report.song) + 1) {
            Some(title) => format!("Next comes {title}."),
            None => "It is the last.".to_string(),
        };
        out.push(format!("Now {}. {next}", self.song_shown()));
        out.extend(self.resumed.clone());
        out.extend(self.moved());
        let keyboards = self.keyboards.iter();
        out.extend(keyboards.map(|device| format!("Keyboard {}.", device.clause())));
        let synths = self.synths.iter();
        out.extend(synths.map(|device| format!("Synth {}.", device.clause())));
        let counters = self.counters().into_iter();
        let gave_way = counters.filter(|counter| counter.count > 0);
        out.extend(gave_way.map(|counter| format!("{}: {}.", counter.words, counter.count)));
        out
    }

    /// What waits, and what is not as the song begins.
    fn moved(&self) -> Vec<String> {
        let Report {
            armed_song,
            armed,
            nudge,
            transpose_keys,
            plain,
            ..
        } = self.report;
        let title = armed_song.and_then(|place| self.titles.get(usize::from(place)));
        let mut out = Vec::new();
        match title {
            Some(title) => out.push(format!("Armed: {title}, as soon as all is quiet.")),
            None if armed > 0 => out.push("Armed: a cue, as soon as all is quiet.".to_string()),
            None => {}
        }
        if nudge != Interval::ZERO {
            out.push(format!("All is {:+.1} c from its pitch.", cents(nudge)));
        }
        if transpose_keys != 0 {
            out.push(format!("Keys are moved by {transpose_keys:+}."));
        }
        if plain {
            out.push("Plain: equal temperament, whatever the song says.".to_string());
        }
        out.extend(by_hand::sentences(&self.report, &self.places));
        out
    }

    fn counters(&self) -> Vec<Counter> {
        let c = &self.report.counters;
        let counter = |name, words, count| Counter { name, words, count };
        vec![
            counter(
                "stolen",
                "Notes ended early for want of a channel",
                c.stolen,
            ),
            counter("tails_cut", "Tails cut for want of a channel", c.tails_cut),
            counter("refused", "Notes refused", c.refused),
            counter("clipped", "Bends held at the end of their range", c.clipped),
            counter(
                "silent",
                "Keys struck that the tuning leaves silent",
                c.silent,
            ),
            counter("ignored", "Commands that could not be followed", c.ignored),
            counter("orphans", "Note-offs without a note", c.orphans),
            counter("bad_bytes", "Input bytes that made no message", c.bad_bytes),
            counter("sysex_lost", "System exclusive messages lost", c.sysex_lost),
            counter("outputs_lost", "Outputs lost", c.overrun),
            counter(
                "overruns",
                "Times that input came too fast and was lost",
                self.overruns,
            ),
            counter("too_long", "Messages too long and left out", self.too_long),
            counter(
                "waited",
                "Cycles after which messages waited for a full port",
                self.waited,
            ),
            counter(
                "dropped",
                "Messages left out because a port stayed full",
                self.dropped,
            ),
        ]
    }
}

struct Counter {
    name: &'static str,
    words: &'static str,
    count: u64,
}

impl Device {
    pub fn is_connected(&self) -> bool {
        !self.ports.is_empty() || self.linked
    }

    fn clause(&self) -> String {
        let name = &self.name;
        match &self.waits {
            _ if !self.ports.is_empty() => {
                format!("{name} is connected to {}", self.ports.join(" and "))
            }
            _ if self.linked => format!("{name} is connected"),
            Waits::ForOthers => format!("{name} is a port for others to connect to"),
            Waits::For(wish) => format!("{name} is not connected; it waits for {wish}"),
        }
    }
}

/// For people; to a thousandth.
pub fn cents(interval: Interval) -> f64 {
    (interval.microcents() as f64 / 1_000.0).round() / 1_000.0
}

fn devices(devices: &[Device]) -> Vec<Value> {
    let device = |device: &Device| {
        let waits_for = match &device.waits {
            Waits::For(wish) if !device.is_connected() => Some(wish),
            _ => None,
        };
        json!({
            "name": device.name,
            "connected": device.is_connected(),
            "ports": device.ports,
            "waits_for": waits_for,
        })
    };
    devices.iter().map(device).collect()
}

fn duration(seconds: u64) -> String {
    let (days, hours, minutes) = (seconds / 86_400, seconds / 3_600 % 24, seconds / 60 % 60);
    match (days, hours, minutes) {
        (0, 0, 0) => format!("{seconds} s"),
        (0, 0, _) => format!("{minutes} min"),
        (0, ..) => format!("{hours} h {minutes} min"),
        _ => format!("{days} d {hours} h"),
    }
}
