//! A hundred edits while somebody plays; `EDITS=1000` makes it a thousand.

use super::stand::Stand;
use super::{NEAR_CENTS, as_vim_does, folder, rename_over, swap_link};
use crate::support::dice::Dice;
use crate::support::receiver::Hold;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::time::{Duration, Instant};

/// A key that is played all the time, and whose pitch each good edit changes.
const PROBE: u8 = 72;
const HELD: [u8; 3] = [60, 64, 67];
/// A good edit is in effect within this time of the file being complete.
const IN_EFFECT: Duration = Duration::from_millis(250);
/// How long anything is waited for before the test gives up on it.
const GIVE_UP: Duration = Duration::from_secs(60);
const BETWEEN: Duration = Duration::from_millis(4);

fn text(offset_cents: i64) -> String {
    format!(
        "stage: Edited while it plays
edits: at-once
keyboards: {{keys: {{port: virtual}}}}
synths: {{organ: {{port: virtual, tail_ms: 50}}}}
tunings:
  moving: {{offsets: {{C: {offset_cents:+}, E: {:+}}}}}
set:
  - {{song: Lantern hymn, tuning: moving}}
",
        -offset_cents
    )
}

#[derive(Clone, Copy, Debug)]
enum Edit {
    InPlace,
    /// Half of it, and the rest through the same open file.
    Slowly,
    /// Half of it, closed; the whole later.
    InTwo,
    RenamedOver,
    AsVim,
    Link,
    Bad,
    Empty,
    Half,
    Gone,
}

const EDITS: [Edit; 10] = [
    Edit::InPlace,
    Edit::Slowly,
    Edit::InTwo,
    Edit::RenamedOver,
    Edit::AsVim,
    Edit::Link,
    Edit::Bad,
    Edit::Empty,
    Edit::Half,
    Edit::Gone,
];

struct Evening {
    stand: Stand,
    file: PathBuf,
    offset_cents: i64,
    played: usize,
    delays: Vec<Delay>,
    metronome: Metronome,
}

/// From a file being complete to its sound.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
struct Delay {
    taken: Duration,
    /// How late this machine woke the metronome meanwhile, at worst.
    late: Duration,
}

/// A thread that only sleeps, for how late this machine is.
struct Metronome {
    worst_nanos: Arc<AtomicU64>,
    stop: Arc<AtomicBool>,
}

impl Metronome {
    fn start() -> Metronome {
        const STEP: Duration = Duration::from_millis(5);
        let (worst_nanos, stop) = (Arc::<AtomicU64>::default(), Arc::<AtomicBool>::default());
        let metronome = Metronome {
            worst_nanos: worst_nanos.clone(),
            stop: stop.clone(),
        };
        std::thread::spawn(move || {
            while !stop.load(Ordering::Relaxed) {
                let began = Instant::now();
                std::thread::sleep(STEP);
                let late = began.elapsed().saturating_sub(STEP);
                worst_nanos.fetch_max(late.as_nanos() as u64, Ordering::Relaxed);
            }
        });
        metronome
    }

    /// The worst since this was last asked.
    fn late(&self) -> Duration {
        Duration::from_nanos(self.worst_nanos.swap(0, Ordering::Relaxed))
    }
}

impl Drop for Metronome {
    fn drop(&mut self) {
        self.stop.store(true, Ordering::Relaxed);
    }
}

impl Evening {
    fn strike(&mut self, key: u8) {
        self.stand.play(&[0x90, key, 100]);
        self.played += 1;
    }

    /// Plays the probe for a while.
    fn play(&mut self, time: Duration) {
        let until = self.stand.now() + time;
        while self.stand.now() < until {
            self.probe();
        }
    }

    fn probe(&mut self) {
        self.strike(PROBE);
        std::thread::sleep(BETWEEN);
        self.stand.play(&[0x80, PROBE, 64]);
        std::thread::sleep(BETWEEN);
    }

    /// Plays the probe until it sounds as the file says; gives the time since `complete`.
    fn play_until_in_effect(&mut self, complete: Duration) -> Duration {
        let wanted = 100.0 * f64::from(PROBE) + self.offset_cents as f64;
        while self.stand.now() < complete + GIVE_UP {
            self.probe();
            let heard = self.stand.heard.lock().expect("no panic there");
            let notes = heard.notes.iter().rev();
            let sounds = |note: &&crate::support::receiver::Note| {
                note.number == PROBE && (note.onset_cents() - wanted).abs() < NEAR_CENTS
            };
            if let Some(first) = notes.take_while(|n| n.on >= complete).filter(sounds).last() {
                return first.on - complete;
            }
        }
        let news = self.stand.news.lock().expect("no panic there");
        panic!("not in effect after {GIVE_UP:?}: {news:?}");
    }

    /// What the last probe sounded is what it should, still.
    fn plays_on_unchanged(&mut self) {
        self.play(Duration::from_millis(20));
        let heard = self.stand.heard.lock().expect("no panic there");
        let wanted = 100.0 * f64::from(PROBE) + self.offset_cents as f64;
        let last = heard.notes.iter().rev().find(|note| note.number == PROBE);
        let cents = last.expect("played").onset_cents();
        assert!((cents - wanted).abs() < NEAR_CENTS, "{cents} for {wanted}");
    }

    fn good(&mut self, edit: Edit, number: usize) {
        let text = text(self.offset_cents);
        let (file, half) = (self.file.clone(), text.len() / 2);
        match edit {
            Edit::InPlace => std::fs::write(file, &text).expect("written"),
            Edit::Slowly => {
                let mut open = std::fs::File::create(file).expect("opened");
                open.write_all(&text.as_bytes()[..half]).expect("written");
                self.play(Duration::from_millis(30));
                open.write_all(&text.as_bytes()[half..]).expect("written");
            }
            Edit::InTwo => {
                std::fs::write(&file, &text[..half]).expect("written");
                self.play(Duration::from_millis(130));
                std::fs::write(&file, &text).expect("written");
            }
            Edit::RenamedOver => rename_over(&file, &text),
            Edit::AsVim => as_vim_does(&file, &text),
            _ => swap_link(&file, &text, number % 2),
        }
        self.metronome.late();
        let taken = self.play_until_in_effect(self.stand.now());
        let late = self.metronome.late();
        self.delays.push(Delay { taken, late });
    }

    fn bad(&mut self, edit: Edit) {
        let text = text(-self.offset_cents);
        let news = |stand: &Stand| stand.news.lock().expect("no panic there").clone();
        match edit {
            Edit::Bad => {
                let bad = text.replace("tuning: moving", "tuning: mowing");
                rename_over(&self.file, &bad);
            }
            Edit::Empty => std::fs::write(&self.file, "").expect("written"),
            Edit::Half => {
                let half = text.find("set:").expect("there") + 20;
                std::fs::write(&self.file, &text[..half]).expect("written");
            }
            _ => std::fs::remove_file(&self.file).expect("removed"),
        }
        let until = self.stand.now() + GIVE_UP;
        while news(&self.stand).complaints.is_empty() {
            assert!(self.stand.now() < until, "{edit:?} was not noticed");
            self.probe();
        }
        self.plays_on_unchanged();
        // Good again with what is played: nothing changes, and nothing is complained about any more.
        rename_over(&self.file, &self::text(self.offset_cents));
        while !news(&self.stand).complaints.is_empty() {
            assert!(
                self.stand.now() < until + GIVE_UP,
                "{edit:?} was not forgotten"
            );
            self.probe();
        }
    }

    fn edit(&mut self, dice: &mut Dice, number: usize) {
        let edit = EDITS[(number + dice.below(2) as usize) % EDITS.len()];
        let pedal = dice.percent(40);
        if pedal {
            self.stand.play(&[0xB0, 64, 127]);
        }
        for key in HELD {
            self.strike(key);
        }
        if matches!(edit, Edit::Bad | Edit::Empty | Edit::Half | Edit::Gone) {
            self.bad(edit);
        } else {
            self.offset_cents = (self.offset_cents + 45 + dice.between(1, 80) as i64) % 91 - 45;
            self.good(edit, number);
        }
        for key in HELD {
            self.stand.play(&[0x80, key, 64]);
        }
        if pedal {
            self.stand.play(&[0xB0, 64, 0]);
        }
        std::thread::sleep(Duration::from_millis(50));
    }
}

fn part(sorted: &[Delay], percent: usize) -> Duration {
    sorted[(sorted.len() - 1) * percent / 100].taken
}

fn begin(file: &Path) -> Evening {
    std::fs::write(file, text(0)).expect("written");
    Evening {
        stand: Stand::new(file, None),
        file: file.to_path_buf(),
        offset_cents: 0,
        played: 0,
        delays: Vec::new(),
        metronome: Metronome::start(),
    }
}

#[test]
fn edits_come_into_force_and_disturb_nothing() {
    let edits = std::env::var("EDITS").ok().and_then(|n| n.parse().ok());
    let edits: usize = edits.unwrap_or(100);
    let mut evening = begin(&folder("edits").join("evening.yaml"));
    let mut dice = Dice::new(20);
    for number in 0..edits {
        evening.edit(&mut dice, number);
    }
    let heard = |stand: &Stand| stand.heard.lock().expect("no panic there").notes.len();
    evening
        .stand
        .wait(GIVE_UP, |stand| heard(stand) >= evening.played);
    let sounds = |stand: &Stand| stand.heard.lock().expect("no panic there").sounding().len();
    evening.stand.wait(GIVE_UP, |stand| sounds(stand) == 0);
    let Evening {
        stand,
        played,
        mut delays,
        ..
    } = evening;
    delays.sort();
    println!(
        "{edits} edits, {} of them good: in effect after {:.1?} (half), {:.1?} (p90), {:.1?} (worst); this machine woke \
         threads up to {:.1?} late meanwhile",
        delays.len(),
        part(&delays, 50),
        part(&delays, 90),
        part(&delays, 100),
        delays.iter().map(|delay| delay.late).max().expect("some"),
    );
    let heard = stand.heard.clone();
    let counters = stand.end();
    let heard = heard.lock().expect("no panic there");
    println!("{} notes played, {} heard", played, heard.notes.len());
    assert_eq!(heard.notes.len(), played, "no note is lost");
    assert!(heard.stuck().is_empty(), "stuck: {:?}", heard.stuck());
    assert!(heard.orphans.is_empty(), "{:?}", heard.orphans);
    let held: Vec<_> = (heard.moves.iter())
        .filter(|moved| moved.hold == Hold::Held)
        .collect();
    assert!(held.is_empty(), "held notes moved: {held:?}");
    assert!(heard.notes.iter().all(|note| !note.cut), "a note was cut");
    assert_eq!(
        (counters.refused, counters.stolen, counters.overrun),
        (0, 0, 0)
    );
    // On a machine that is itself late, we may be late by as much at each of the few waits on the way.
    let over = |delay: &&Delay| delay.taken > IN_EFFECT + 5 * delay.late;
    let over: Vec<&Delay> = delays.iter().filter(over).collect();
    assert!(over.is_empty(), "later than {IN_EFFECT:?}: {over:?}");
}

#[test]
fn a_bend_range_changes_once_the_synth_is_silent() {
    let file = folder("edits-of-a-synth").join("evening.yaml");
    let mut evening = begin(&file);
    for key in HELD {
        evening.strike(key);
    }
    let edited = text(10).replace("tail_ms: 50", "tail_ms: 50, bend_range: 12");
    rename_over(&file, &edited);
    evening.offset_cents = 10;
    evening.play_until_in_effect(evening.stand.now());
    let range = |stand: &Stand| stand.heard.lock().expect("no panic there").range_cents(0);
    assert_eq!(
        range(&evening.stand),
        200.0,
        "under held keys nothing is told"
    );
    for key in HELD {
        evening.stand.play(&[0x80, key, 64]);
    }
    assert!(evening.stand.wait(GIVE_UP, |stand| range(stand) == 1200.0));
    // Set-up is said in pieces.
    std::thread::sleep(Duration::from_millis(300));
    evening.play_until_in_effect(evening.stand.now());
    let heard = evening.stand.heard.clone();
    evening.stand.end();
    let heard = heard.lock().expect("no panic there");
    assert!(heard.stuck().is_empty());
    assert!(heard.moves.iter().all(|moved| moved.hold != Hold::Held));
}

#[test]
fn whoever_asks_is_heard_at_once() {
    let file = folder("edits-asked").join("evening.yaml");
    let evening = begin(&file);
    let reloads = |stand: &Stand| stand.news.lock().expect("no panic there").reloads;
    std::fs::write(&file, text(7)).expect("written");
    evening.stand.ask();
    assert!(evening.stand.wait(GIVE_UP, |stand| reloads(stand) == 1));
    evening.stand.end();
}
