//! What the player has changed of the song by hand, in sentences and as JSON.

use super::status::cents;
use crate::engine::plan::NameId;
use crate::engine::{Place, Report};
use crate::intonation::{Sevenths, Standing};
use crate::pitch::Interval;
use crate::tuning::Letter;
use serde_json::{Value, json};

type Names = [(NameId, String)];

/// Of what is not at home.
pub fn sentences(report: &Report, names: &Names) -> Vec<String> {
    let mut out = Vec::new();
    if let Some(tonic) = report.tonic {
        let far = report.tonic_from_home;
        let moved = far != Interval::ZERO;
        if report.tonic_moved || moved {
            let far = match moved {
                true => format!(", {:+.1} c from home", cents(far)),
                false => String::new(),
            };
            out.push(format!("The tonic is {tonic}{far}."));
        }
    }
    if report.root_held {
        out.push(match report.standing.chord.root {
            Some(root) => format!("The root is held on {}.", Letter::usual(root)),
            None => "The root of the next chord will be held.".to_string(),
        });
    }
    match report.sevenths {
        Some(Sevenths::Harmonic) => out.push("Sevenths are harmonic, 7/4.".to_string()),
        Some(Sevenths::Plain) => out.push("Sevenths are plain.".to_string()),
        None => {}
    }
    if report.waits_for_key {
        out.push("The next key is waited for: it names the tonic or the root.".to_string());
    }
    for (key, place, nudge) in report.off_home() {
        let place = match place {
            Place::Home => String::new(),
            Place::Named(id) => format!(" at {}", name(id, names)),
        };
        let nudge = match nudge == Interval::ZERO {
            true => String::new(),
            false => format!(" {:+.1} c from there", cents(nudge)),
        };
        let nudge = match place.is_empty() {
            true => nudge.replace("there", "its place"),
            false => nudge,
        };
        out.push(format!("{key} is{place}{nudge}."));
    }
    for key in report.go_alone() {
        out.push(format!("Some {key} go alone."));
    }
    for name in report.told_names.iter().flatten() {
        out.push(format!("The black key is {name}."));
    }
    out
}

/// `null` where the tuning goes by letter.
pub fn tonic(report: &Report) -> Value {
    report.tonic.map_or(Value::Null, |tonic| {
        json!({
            "key": tonic.to_string(),
            "from_home_cents": cents(report.tonic_from_home),
        })
    })
}

pub fn inflections(report: &Report, names: &Names) -> Value {
    let all = report.off_home().map(|(key, place, nudge)| {
        let place = match place {
            Place::Home => "home",
            Place::Named(id) => name(id, names),
        };
        json!({"key": key.to_string(), "place": place, "nudge_cents": cents(nudge)})
    });
    all.collect()
}

pub fn black_keys(report: &Report) -> Value {
    let names = report.told_names.iter().flatten();
    names.map(|name| Value::from(name.to_string())).collect()
}

/// What every black key with two names is now.
pub fn black_keys_now(report: &Report) -> Value {
    let names = report.black_keys.iter().flatten();
    names.map(|name| Value::from(name.to_string())).collect()
}

/// What the harmony calls the black keys now, for a line of its own.
pub fn by_chord(report: &Report) -> Option<String> {
    let names: Vec<String> = (report.black_keys.iter().flatten())
        .filter(|name| !report.told_names.contains(&Some(**name)))
        .map(|name| name.to_string())
        .collect();
    (report.by_chord && !names.is_empty())
        .then(|| format!("By chord the black keys are {} now.", names.join(", ")))
}

fn name(id: NameId, names: &Names) -> &str {
    let known = names.iter().find(|(known, _)| *known == id);
    known.map_or("another place", |(_, name)| name)
}

/// The chord that sounds now, for a line of its own; `None` where no harmony is followed, or nothing sounds.
pub fn chord(standing: &Standing) -> Option<String> {
    let root = Letter::usual(standing.chord.root?);
    let anchor = cents(standing.anchor?);
    let shape = shape(standing).map_or(String::new(), |shape| format!(", {shape}"));
    let drift = match cents(standing.drift) {
        near if near.abs() < 0.05 => "at rest".to_string(),
        far => format!("{far:+.1} c from rest"),
    };
    Some(format!(
        "The chord stands on {root} ({anchor:+.1} c from equal){shape}, {drift}."
    ))
}

/// `4:5:6`.
pub fn shape(standing: &Standing) -> Option<String> {
    let numbers: Vec<String> = standing.chord.ratio().map(|n| n.to_string()).collect();
    (!numbers.is_empty()).then(|| numbers.join(":"))
}

#[cfg(test)]
mod tests;
