//! Tunings against published tables. `figures.json` holds the figures with their sources; what stands in the code names
//! its source beside it.

mod beats;
mod cents;
mod words;

use serde_json::Value;
use std::path::Path;
use trued::offline::chart::Chart;
use trued::pitch::Hertz;
use trued::stage::Stage;
use trued::stage::complaint::{Complaints, Trail};
use trued::stage::tunings::Library;
use trued::tuning::{Key, Pin};

/// What trued calls each tuning, and what the figures call it.
const NAMES: [(&str, &str); 27] = [
    ("equal-12", "equal_12"),
    ("pythagorean", "pythagorean"),
    ("quarter-comma-meantone", "meantone_1_4"),
    ("fifth-comma-meantone", "meantone_1_5"),
    ("sixth-syntonic-meantone", "meantone_1_6_sc"),
    ("sixth-pythagorean-meantone", "meantone_1_6_pc"),
    ("two-sevenths-comma-meantone", "meantone_2_7"),
    ("third-comma-meantone", "meantone_1_3"),
    ("werckmeister-3", "werckmeister_3"),
    ("kirnberger-2", "kirnberger_2"),
    ("kirnberger-3", "kirnberger_3"),
    ("vallotti", "vallotti"),
    ("young-1", "young_1"),
    ("young-2", "young_2"),
    ("neidhardt-1724-big-city", "neidhardt_1724_bigcity"),
    ("kellner", "kellner"),
    ("five-limit-scale", "duodene"),
    ("harmonics-8-16", "harmonics_8_16"),
    ("bohlen-pierce", "bohlen_pierce_equal"),
    ("equal-19", "edo_19"),
    ("equal-22", "edo_22"),
    ("equal-24", "edo_24"),
    ("equal-31", "edo_31"),
    ("equal-53", "edo_53"),
    ("partch-43", "partch_43"),
    ("urmawi-17", "urmawi_17"),
    ("rast-53-arab", "rast_arab_53"),
];

fn figures() -> Value {
    serde_json::from_str(include_str!("figures.json")).expect("our own file is JSON")
}

fn shipped_name(figure: &str) -> &'static str {
    let found = NAMES.iter().find(|(_, name)| *name == figure);
    found
        .unwrap_or_else(|| panic!("no tuning is checked by {figure}"))
        .0
}

/// A shipped tuning with A4 at `a4_hz`.
fn chart_at(name: &str, a4_hz: f64) -> Chart {
    let mut complaints = Complaints::default();
    let mut library = Library::new(None, Path::new("nowhere/stage.yaml"), &mut complaints);
    let found = library
        .find(name, &Trail::default(), &mut complaints)
        .expect(name);
    let hertz = Hertz::from_micro((a4_hz * 1e6) as u64).expect("above zero");
    let placement = found.placement(None, None, Some((Key::A4, hertz, Pin::Key)));
    Chart::of_tuning(&found, placement).expect(name)
}

fn chart(name: &str) -> Chart {
    chart_at(name, 440.0)
}

/// The first song of a stage text.
fn song_chart(text: &str) -> Chart {
    match Stage::parse(Path::new("nowhere/stage.yaml"), text) {
        Ok(stage) => Chart::of_song(&stage.set[0]),
        Err(complaints) => panic!("{text}\n{complaints:#?}"),
    }
}

fn cents(chart: &Chart, key: u8) -> f64 {
    let key = Key::new(key).expect("a key");
    chart
        .key(key)
        .unwrap_or_else(|| panic!("{key} is silent"))
        .cents
}

fn hertz(chart: &Chart, key: u8) -> f64 {
    let key = Key::new(key).expect("a key");
    chart
        .key(key)
        .unwrap_or_else(|| panic!("{key} is silent"))
        .hz
}

fn numbers(value: &Value) -> Vec<f64> {
    let list = value.as_array().expect("a list");
    list.iter()
        .map(|number| number.as_f64().expect("a number"))
        .collect()
}
