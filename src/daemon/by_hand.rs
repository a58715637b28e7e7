//! What the player has changed of the song by hand, in sentences and as JSON.

use super::status::cents;
use crate::engine::plan::NameId;
use crate::engine::{Place, Report};
use crate::pitch::Interval;
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
    if report.waits_for_key {
        out.push("The next key will be the tonic.".to_string());
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
    for name in report.second_names.iter().flatten() {
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
    let names = report.second_names.iter().flatten();
    names.map(|name| Value::from(name.to_string())).collect()
}

fn name(id: NameId, names: &Names) -> &str {
    let known = names.iter().find(|(known, _)| *known == id);
    known.map_or("another place", |(_, name)| name)
}
