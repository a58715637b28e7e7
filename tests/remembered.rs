//! What outlasts a restart or a pulled plug: on a disk that forgets, on real files, in the real binary.

/// A disk whose power can go at any step.
mod disk;

/// A thousand pulled plugs.
mod plug;

/// When it is written, in simulated time.
mod pace;

/// Text, damage, changed sets, disks that cannot be written.
mod record;

/// Tonic, places of keys and black keys.
mod by_hand;

/// The binary: restarts, signals, `--fresh`.
mod daemon;

use std::path::Path;
use trued::daemon::remember::record::{Evening, State};
use trued::pitch::{Interval, Pitch};
use trued::stage::Stage;

const TITLES: [&str; 5] = ["Lantern hymn", "Ballad", "Lament", "Harbour tag", "Ballad"];

/// An evening with songs of these titles, all alike.
fn stage_with(name: &str, titles: &[&str]) -> Stage {
    let songs: Vec<String> = titles
        .iter()
        .map(|title| format!("  - {title}\n"))
        .collect();
    let mut book: Vec<&str> = titles.to_vec();
    book.sort_unstable();
    book.dedup();
    let book: Vec<String> = book
        .iter()
        .map(|title| format!("  {title}: {{}}\n"))
        .collect();
    let text = format!(
        "stage: {name}\nsongs:\n{}set:\n{}",
        book.concat(),
        songs.concat()
    );
    stage_of(&text)
}

fn stage_of(text: &str) -> Stage {
    let stage = Stage::parse(Path::new("/evening/stage.yaml"), text);
    stage.unwrap_or_else(|complaints| panic!("{complaints:?}"))
}

fn evening() -> Evening {
    Evening {
        file: "/evening/stage.yaml".to_string(),
        stage: "Evening".to_string(),
    }
}

/// The n-th of a row of states of which no two are alike.
fn state(number: u64) -> State {
    let place = number % TITLES.len() as u64;
    State {
        place: place as u16,
        title: TITLES[place as usize].to_string(),
        nudge: Interval::from_microcents(number as i64 * 1_000),
        transposed: (number.is_multiple_of(3)).then_some((number % 7) as i8 - 3),
        plain: number % 2 == 1,
        tonic: (number % 5 == 4).then(|| (62, 69, Pitch::from_microcents(number as i64))),
        by_hand: (0..number % 4)
            .map(|n| format!("inflect B4 +{n} c"))
            .collect(),
    }
}

/// The only file of a folder whose name begins so.
fn only_file(folder: &Path, start: &str) -> Option<std::path::PathBuf> {
    let entries = std::fs::read_dir(folder).ok()?;
    let named = |path: &std::path::PathBuf| {
        let name = path.file_name().unwrap_or_default().to_string_lossy();
        name.starts_with(start) && !name.ends_with(".new")
    };
    let mut found = entries
        .filter_map(|entry| Some(entry.ok()?.path()))
        .filter(named);
    let one = found.next();
    assert!(
        found.next().is_none(),
        "more than one in {}",
        folder.display()
    );
    one
}
