//! Ten thousand random notes with chords, pedals and re-strikes, heard by the independent receiver.
//!
//! What must hold after every single input: each note sounds where the published cents put it, to half a step of the
//! bend; no note sticks, is doubled or ended twice; nothing that a key or a pedal holds, or that still rings, is bent by
//! another's note; nothing is said twice. `cargo test random_play -- --nocapture` prints the table.

mod player;

use crate::support::published::{FIVE_TUNINGS, Published};
use crate::support::receiver::{Hold, Receiver};
use crate::support::rig::{Rig, elapsed};
use player::{Action, Player};
use std::fmt::Write;
use std::path::Path;
use trued::engine::{Command, Counters, Plan};
use trued::stage::Stage;
use trued::time::Span;

const NOTES: usize = 10_000;
/// Bends are not counted until every pitch has had its channel.
const WARM_UP_NOTES: usize = 100;
const BENDS_PER_NOTE_MAX: f64 = 0.01;
/// Published cents and trued's pitches are both rounded to the millionth.
const ROUNDING_CENTS: f64 = 2e-6;

#[derive(Clone, Copy)]
struct Run {
    tuning: &'static Published,
    dialect: &'static str,
    range: u8,
    /// Wheel, pressure, controllers, programs and a second keyboard too.
    hands: bool,
    seed: u64,
}

impl Run {
    /// Through a stage file, as a player would have it.
    fn plan(&self) -> Plan {
        let text = format!(
            "stage: Random play\n\
             keyboards:\n  upper: {{port: virtual, wheel: 1}}\n  lower: {{port: virtual, wheel: 1}}\n\
             synths:\n  synth: {{port: virtual, dialect: {}, bend_range: {}}}\n\
             set:\n  - {{song: Dice, tuning: {}}}\n",
            self.dialect, self.range, self.tuning.name
        );
        match Stage::parse(Path::new("random.yaml"), &text) {
            Ok(stage) => *stage.plan_offline(),
            Err(complaints) => panic!("{text}\n{complaints:#?}"),
        }
    }

    fn half_step_cents(&self) -> f64 {
        self.range as f64 * 100.0 / 8192.0 / 2.0 + ROUNDING_CENTS
    }

    /// The receiver adds the wheel apart under MPE, and that is rounded to a step too.
    fn wheel_step_cents(&self) -> f64 {
        match self.dialect {
            "mpe" => 100.0 / 8192.0 / 2.0,
            _ => 0.0,
        }
    }
}

/// What a run came to.
struct Outcome {
    heard: Receiver,
    counters: Counters,
    worst_cents: f64,
    bends_per_note: f64,
}

struct Performance {
    run: Run,
    rig: Rig,
    player: Player,
    script: String,
    worst_cents: f64,
    /// Bends heard by the time the warm-up was over.
    warm_up_bends: u64,
    moves_seen: usize,
    notes_seen: usize,
}

impl Performance {
    fn new(run: Run) -> Performance {
        Performance {
            run,
            rig: Rig::ready(&run.plan()),
            player: Player::new(run.seed, run.hands),
            script: String::new(),
            worst_cents: 0.0,
            warm_up_bends: 0,
            moves_seen: 0,
            notes_seen: 0,
        }
    }

    fn play(mut self) -> Outcome {
        while self.player.notes < NOTES {
            for action in self.player.next() {
                self.act(action);
            }
            if self.notes_seen <= WARM_UP_NOTES {
                self.warm_up_bends = self.rig.heard().bends;
            }
        }
        for action in self.player.let_go() {
            self.act(action);
        }
        self.rig.until(self.rig.now + Span::from_millis(10));
        self.rig.command(Command::End);
        self.check_end();
        let report = self.rig.engine.report();
        let heard = self.rig.receivers.remove(0);
        Outcome {
            bends_per_note: (heard.bends - self.warm_up_bends) as f64
                / (self.notes_seen - WARM_UP_NOTES) as f64,
            heard,
            counters: report.counters,
            worst_cents: self.worst_cents,
        }
    }

    fn act(&mut self, action: Action) {
        self.rig
            .until(self.rig.now + Span::from_millis(action.after_ms));
        let _ = write!(
            self.script,
            "{} ms, keyboard {}:",
            self.rig.now.nanos() / 1_000_000,
            action.keyboard
        );
        for byte in &action.bytes {
            let _ = write!(self.script, " {byte:02X}");
        }
        self.script.push('\n');
        self.rig.midi(action.keyboard, &action.bytes);
        self.check_onsets(&action);
        self.check_moves(&action);
        self.check_faults();
    }

    fn check_onsets(&mut self, action: &Action) {
        let new = &self.rig.heard().notes[self.notes_seen..];
        let wanted = action.strikes.is_some() as usize;
        if new.len() != wanted {
            let report = self.rig.engine.report();
            self.fail(&format!(
                "{} notes began, not {wanted}; {report:?}",
                new.len()
            ));
        }
        self.notes_seen += wanted;
        let (Some((key, velocity)), Some(note)) = (action.strikes, new.first()) else {
            return;
        };
        let target = self.run.tuning.key_cents(key) + self.player.wheel_cents();
        let error = (note.onset_cents() - target).abs();
        self.worst_cents = self.worst_cents.max(error);
        if error > self.run.half_step_cents() + self.run.wheel_step_cents()
            || note.velocity != velocity
        {
            self.fail(&format!("key {key} should sound {target:.6}: {note:?}"));
        }
    }

    fn check_moves(&mut self, action: &Action) {
        let heard = self.rig.heard();
        let new = &heard.moves[self.moves_seen..];
        self.moves_seen = heard.moves.len();
        let few_groups = self.run.tuning.groups <= 12;
        for moved in new {
            let stray = match moved.hold {
                Hold::Held => !action.is_wheel,
                // A plain synth's tails may follow the player's wheel later, with the channel's next note.
                Hold::Ringing => few_groups && !self.run.hands,
            };
            if stray {
                self.fail(&format!("{moved:?} of {:?}", heard.notes[moved.note]));
            }
        }
        if action.is_wheel {
            self.check_wheel();
        }
    }

    /// After the wheel has moved, everything held stands at its key's pitch plus the wheel.
    fn check_wheel(&self) {
        let slack = 2.0 * (self.run.half_step_cents() + self.run.wheel_step_cents());
        for note in self.rig.heard().sounding() {
            let from = note.onset_cents() - self.player.wheel_at(note.on);
            let wanted = from + self.player.wheel_cents();
            if (note.cents() - wanted).abs() > slack {
                self.fail(&format!(
                    "the wheel should have brought it to {wanted:.3}: {note:?}"
                ));
            }
        }
    }

    fn check_faults(&self) {
        let heard = self.rig.heard();
        // Where more pitches sound than there are channels, a note may be cut short by All Sound Off, or join its own
        // number on its channel.
        let dry = self.run.tuning.groups > 12;
        for (what, faults, allowed) in [
            ("orphan note-offs", &heard.orphans, false),
            ("repeats", &heard.repeats, false),
            ("prohibited on a member", &heard.prohibited, false),
            ("doubled notes", &heard.doubled, dry),
            (
                "mode messages",
                &heard.modes,
                dry && heard.modes.iter().all(|m| m.message[1] == 120),
            ),
        ] {
            if !faults.is_empty() && !allowed {
                self.fail(&format!("{what}: {faults:02X?}"));
            }
        }
        if heard.stray_bytes() + heard.zones_while_sounding > 0 {
            self.fail("stray bytes, or a zone told while notes sound");
        }
    }

    fn check_end(&self) {
        let heard = self.rig.heard();
        if !heard.stuck().is_empty() || !heard.sounding().is_empty() {
            self.fail(&format!(
                "stuck {:?}, sounding {:?}",
                heard.stuck(),
                heard.sounding()
            ));
        }
        self.check_faults();
    }

    /// Keeps the whole script, prints its end.
    fn fail(&self, why: &str) -> ! {
        let Run {
            tuning,
            dialect,
            range,
            hands,
            seed,
        } = self.run;
        let file = Path::new(env!("CARGO_TARGET_TMPDIR")).join(format!("random-play-{seed}.txt"));
        let kept = std::fs::write(&file, &self.script);
        let lines: Vec<&str> = self.script.lines().collect();
        let last = &lines[lines.len().saturating_sub(40)..];
        panic!(
            "seed {seed}, {}, {dialect}, bend range {range}, hands {hands}: {why}\nat {:?}; the last {} of {} lines \
             (all of them: {}, {kept:?}):\n{}",
            tuning.name,
            elapsed(self.rig.now),
            last.len(),
            lines.len(),
            file.display(),
            last.join("\n")
        )
    }
}

fn table(runs: &[Run]) -> String {
    let mut out = String::from(
        "tuning                  dialect       range  notes  stuck  orphans  held bent  tails bent  repeats  bends/note  \
         worst cents  half step  stolen  tails cut\n",
    );
    for run in runs {
        let Outcome {
            heard,
            counters,
            worst_cents,
            bends_per_note,
        } = Performance::new(*run).play();
        let moved = |hold| heard.moves.iter().filter(|m| m.hold == hold).count();
        let _ = writeln!(
            out,
            "{:<24}{:<14}{:>5}{:>7}{:>7}{:>9}{:>11}{:>12}{:>9}{:>12.4}{:>13.4}{:>11.4}{:>8}{:>11}",
            run.tuning.name,
            run.dialect,
            run.range,
            heard.notes.len(),
            heard.stuck().len(),
            heard.orphans.len(),
            moved(Hold::Held),
            moved(Hold::Ringing),
            heard.repeats.len(),
            bends_per_note,
            worst_cents,
            run.half_step_cents(),
            counters.stolen,
            counters.tails_cut,
        );
        assert!(heard.notes.len() >= NOTES);
        assert!(moved(Hold::Held) == 0 || run.hands);
        if run.tuning.groups <= 12 && !run.hands {
            assert!(
                bends_per_note <= BENDS_PER_NOTE_MAX,
                "seed {}: {bends_per_note}",
                run.seed
            );
            assert_eq!(
                (counters.stolen, counters.tails_cut),
                (0, 0),
                "seed {}",
                run.seed
            );
        }
    }
    out
}

fn runs(dialect: &'static str, hands: bool) -> Vec<Run> {
    let mut runs = Vec::new();
    for tuning in FIVE_TUNINGS {
        for range in [2, 12, 48] {
            let seed = 1 + runs.len() as u64 + 100 * hands as u64;
            runs.push(Run {
                tuning,
                dialect,
                range,
                hands,
                seed,
            });
        }
    }
    runs
}

#[test]
fn channel_bend_is_in_tune_and_leaves_alone_what_sounds() {
    println!("{}", table(&runs("channel-bend", false)));
}

#[test]
fn mpe_is_in_tune_and_leaves_alone_what_sounds() {
    println!("{}", table(&runs("mpe", false)));
}

#[test]
fn the_player_s_hands_reach_a_plain_synth() {
    println!(
        "With wheel, pressure, controllers, programs, two keyboards:\n{}",
        table(&runs("channel-bend", true))
    );
}

#[test]
fn the_player_s_hands_reach_an_mpe_synth() {
    println!(
        "With wheel, pressure, controllers, programs, two keyboards:\n{}",
        table(&runs("mpe", true))
    );
}
