//! The last good text, kept for a start at which the file is bad.

use super::stand::Stand;
use super::{NEAR_CENTS, folder, rename_over};
use std::path::Path;
use std::time::Duration;
use trued::daemon::state::Boot;

const GIVE_UP: Duration = Duration::from_secs(60);

const STAGE: &str = "stage: Kept
rig: rig.yaml
set:
  - {song: Lantern hymn, tuning: mine}
";
const RIG: &str = "keyboards: {keys: {port: virtual}}
synths: {organ: {port: virtual, tail_ms: 50}}
";

fn write_all(folder: &Path) {
    std::fs::create_dir_all(folder.join("tunings")).expect("a folder");
    for (name, text) in [
        ("evening.yaml", STAGE),
        ("rig.yaml", RIG),
        ("tunings/mine.yaml", "offsets: {C: +11}\n"),
    ] {
        std::fs::write(folder.join(name), text).expect("written");
    }
}

fn errors(found: Result<Boot, Vec<trued::stage::complaint::Complaint>>) -> Vec<String> {
    let complaints = found.err().expect("bad");
    complaints.iter().map(ToString::to_string).collect()
}

#[test]
fn a_bad_file_at_the_start_leaves_the_last_good_one_playing() {
    let folder = folder("kept");
    let (state, file) = (folder.join("state"), folder.join("evening.yaml"));
    write_all(&folder);
    Stand::new(&file, Some(&state)).end();
    // Everything that it was made of is gone or bad.
    std::fs::remove_file(folder.join("rig.yaml")).expect("removed");
    std::fs::remove_dir_all(folder.join("tunings")).expect("removed");
    std::fs::write(&file, "stage: Kept\nset: [").expect("written");

    let boot = Boot::read(&file, Some(&state)).expect("the copy");
    assert_eq!(boot.stage.texts, [STAGE, RIG, "offsets: {C: +11}\n"]);
    assert!(!boot.complaints.is_empty());
    let alone = errors(Boot::read(&file, None));
    let told: Vec<String> = boot.complaints.iter().map(ToString::to_string).collect();
    assert_eq!(told, alone, "the complaints of the file itself");

    let stand = Stand::new(&file, Some(&state));
    let news = |stand: &Stand| stand.news.lock().expect("no panic there").clone();
    let at_first = news(&stand);
    assert!(
        at_first.from_copy && at_first.complaints == alone,
        "{at_first:?}"
    );
    stand.play(&[0x90, 72, 100]);
    let sounds = |stand: &Stand, cents: f64| {
        let heard = stand.heard.lock().expect("no panic there");
        let last = heard.notes.last();
        last.is_some_and(|note| (note.onset_cents() - cents).abs() < NEAR_CENTS)
    };
    assert!(stand.wait(GIVE_UP, |stand| sounds(stand, 7211.0)));

    // The file is mended, and the tuning with it, which nobody watched.
    rename_over(
        &file,
        &STAGE.replace("stage: Kept", "stage: Mended\nedits: at-once"),
    );
    std::fs::write(folder.join("rig.yaml"), RIG).expect("written");
    std::fs::create_dir(folder.join("tunings")).expect("a folder");
    std::fs::write(folder.join("tunings/mine.yaml"), "offsets: {C: -7}\n").expect("written");
    assert!(
        stand.wait(GIVE_UP, |stand| news(stand).reloads > 0),
        "{:?}",
        news(&stand)
    );
    assert!(!news(&stand).from_copy && news(&stand).complaints.is_empty());
    stand.play(&[0x80, 72, 64, 0x90, 72, 100]);
    assert!(stand.wait(GIVE_UP, |stand| sounds(stand, 7193.0)));
    stand.play(&[0x80, 72, 64]);
    stand.end();
    let boot = Boot::read(&file, Some(&state)).expect("good");
    assert!(boot.complaints.is_empty());
}

#[test]
fn with_neither_file_nor_copy_there_are_only_complaints() {
    let folder = folder("kept-none");
    let (state, file) = (folder.join("state"), folder.join("evening.yaml"));
    write_all(&folder);
    Stand::new(&file, Some(&state)).end();
    let copy = std::fs::read_dir(&state).expect("kept").next();
    let copy = copy.expect("one file").expect("a file").path();
    // Another stage file has no part in it, and half a copy is none.
    let other = folder.join("other.yaml");
    std::fs::write(&other, "").expect("written");
    assert!(!errors(Boot::read(&other, Some(&state))).is_empty());
    let bytes = std::fs::read(&copy).expect("read");
    std::fs::write(&copy, &bytes[..bytes.len() / 2]).expect("written");
    std::fs::write(&file, "").expect("written");
    assert!(!errors(Boot::read(&file, Some(&state))).is_empty());
}

#[test]
fn where_nothing_can_be_kept_the_music_goes_on() {
    let folder = folder("kept-nowhere");
    write_all(&folder);
    // A file stands where the folder should be: nobody, not even root, can write there.
    let state = folder.join("state");
    std::fs::write(&state, "").expect("written");
    let stand = Stand::new(&folder.join("evening.yaml"), Some(&state));
    stand.play(&[0x90, 72, 100]);
    let played = |stand: &Stand| stand.heard.lock().expect("no panic there").notes.len() == 1;
    assert!(stand.wait(GIVE_UP, played));
    stand.end();
    assert_eq!(std::fs::read(&state).expect("still there"), b"");
}
