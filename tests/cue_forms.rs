//! Every form of a cue with every action, at random, against a small model written from the language alone.
//!
//! After each gesture song, nudge, transposition, plain, tonic and what is armed agree; no note sticks; no held note moves
//! but by `pitch ... now` and in a song that follows chords; each note of the others begins where the model's song puts
//! it; lamps show what the model says. A failure names its seed.

/// What has cues, and what may stand in them.
mod controls;
/// What lasts, and what each key then sounds.
mod lasting;

use crate::support::dice::Dice;
use crate::support::receiver::Hold;
use crate::support::rig::{Rig, keyboard_id};
use controls::{ACTIONS, CONTROLS, Cue, LAMPS, TITLES, can_be_held, forms, some_cues, stage};
use lasting::{FOLLOWS, Lasting};
use std::collections::{BTreeMap, BTreeSet};
use std::time::Duration;
use trued::engine::{Input, Link, Onset};
use trued::intonation::Sevenths;
use trued::time::{Span, Time};

#[derive(Clone, Copy)]
struct Wait {
    /// The next key is the root, else the tonic.
    root: bool,
    sounds: bool,
    /// The keyboard and control that asked, if it was a cue's.
    asked_by: Option<(usize, usize)>,
    while_held: bool,
}

/// What should be, by the language.
#[derive(Default)]
struct Model {
    cues: Vec<Cue>,
    song: usize,
    latched: Lasting,
    /// Keyboard, control and action, in the order they went down.
    held: Vec<(usize, usize, &'static str)>,
    wait: Option<Wait>,
    armed: Vec<&'static str>,
    stepped_at: Option<u64>,
    /// Keyboard and control: since when, and whether its long press has fired.
    down: BTreeMap<(usize, usize), (u64, bool)>,
    /// Keyboard and key, or pedal.
    hands: BTreeSet<(usize, u8, bool)>,
    asked: usize,
    lamps_away: bool,
    /// Since when each song played, in milliseconds.
    songs: Vec<(u64, usize)>,
    moved_at: BTreeSet<u64>,
    /// Control, form and action of every cue that has fired.
    fired: BTreeSet<Fired>,
}

type Fired = (usize, &'static str, &'static str);

impl Model {
    fn with(&self, control: usize, form: &str) -> Vec<usize> {
        let is_it = |at: &usize| self.cues[*at].control == control && self.cues[*at].form == form;
        (0..self.cues.len()).filter(is_it).collect()
    }

    fn passes(&self, control: usize) -> bool {
        self.cues
            .iter()
            .any(|cue| cue.control == control && cue.pass)
    }

    fn press(&mut self, at: u64, keyboard: usize, control: usize) {
        let place = (keyboard, control);
        if CONTROLS[control].up.is_empty() {
            return self.fire_all(at, place, "once");
        }
        if self.with(control, "long").is_empty() {
            self.fire_all(at, place, "down");
        }
        self.fire_all(at, place, "either");
        self.fire_all(at, place, "held");
        self.down.insert((keyboard, control), (at, false));
    }

    fn let_go(&mut self, at: u64, keyboard: usize, control: usize) {
        let Some((_, was_long)) = self.down.remove(&(keyboard, control)) else {
            return;
        };
        self.let_go_held(at, |held| held == (keyboard, control));
        let may_be_long = !self.with(control, "long").is_empty();
        for cue in 0..self.cues.len() {
            let fires = self.cues[cue].control == control
                && match self.cues[cue].form {
                    "down" => may_be_long && !was_long,
                    "up" => !was_long,
                    form => form == "either",
                };
            if fires {
                self.fire(at, (keyboard, control), cue);
            }
        }
    }

    fn fire_all(&mut self, at: u64, place: (usize, usize), form: &str) {
        for cue in self.with(place.1, form) {
            self.fire(at, place, cue);
        }
    }

    fn let_go_held(&mut self, at: u64, gone: impl Fn((usize, usize)) -> bool) {
        for (keyboard, control, action) in std::mem::take(&mut self.held) {
            if !gone((keyboard, control)) {
                self.held.push((keyboard, control, action));
            } else if action.ends_with(" now") {
                self.moved_at.insert(at);
            }
        }
        let ends = |wait: &mut Wait| wait.while_held && wait.asked_by.is_some_and(&gone);
        self.wait.take_if(ends);
    }

    /// Long presses whose time comes up to `to`, in their order.
    fn pass_time(&mut self, to: u64) {
        loop {
            let mut due = Vec::new();
            for (place, (since, done)) in &self.down {
                for cue in self.with(place.1, "long") {
                    due.push((since + self.cues[cue].long_ms, *place, cue, *done));
                }
            }
            let next = due
                .into_iter()
                .filter(|(at, _, _, done)| !done && *at <= to)
                .min();
            let Some((at, place, cue, _)) = next else {
                return;
            };
            if let Some((_, done)) = self.down.get_mut(&place) {
                *done = true;
            }
            self.fire(at, place, cue);
        }
    }

    fn fire(&mut self, at: u64, place: (usize, usize), cue: usize) {
        let action = self.cues[cue].action;
        self.fired.insert((place.1, self.cues[cue].form, action));
        if action == "next from Third" && self.song != 2 {
            return;
        }
        if ["next", "back", "next from Third"].contains(&action) {
            if self.stepped_at.is_some_and(|before| at < before + 400) {
                return;
            }
            self.stepped_at = Some(at);
        }
        if !self.cues[cue].quiet && action.contains("next-key") {
            if self.has_next_key(action) {
                self.wait = Some(Wait {
                    root: action == "root next-key",
                    sounds: self.cues[cue].pass,
                    asked_by: Some(place),
                    while_held: self.cues[cue].form == "held",
                });
            }
            return;
        }
        if self.cues[cue].form == "held" {
            self.held.retain(|held| (held.0, held.1) != place);
            if self.in_force().take(self.song, action) {
                self.held.push((place.0, place.1, action));
            }
            if action.ends_with(" now") {
                self.moved_at.insert(at);
            }
            return;
        }
        if !self.cues[cue].quiet {
            return self.act(at, action);
        }
        if changes_song(action) && self.goal(action).is_none() {
            return;
        }
        let kind = |action: &str| match action {
            action if changes_song(action) => String::from("song"),
            action if action.starts_with("inflect") => {
                action.split(' ').take(2).collect::<Vec<_>>().join(" ")
            }
            "tonic home" | "tonic next-key pivot" | "root next-key" => action.to_string(),
            action => action.split(' ').next().unwrap_or_default().to_string(),
        };
        self.armed.retain(|other| kind(other) != kind(action));
        self.armed.push(action);
        self.when_quiet(at);
    }

    fn when_quiet(&mut self, at: u64) {
        while self.hands.is_empty() && !self.armed.is_empty() {
            let action = self.armed.remove(0);
            self.act(at, action);
        }
    }

    fn goal(&self, action: &str) -> Option<usize> {
        match action {
            "next" | "next from Third" => Some(self.song + 1).filter(|song| *song < TITLES.len()),
            "back" => self.song.checked_sub(1),
            "song 3" => Some(2),
            "song Fifth" => Some(FOLLOWS),
            _ => Some(0),
        }
    }

    fn act(&mut self, at: u64, action: &'static str) {
        if changes_song(action) {
            if action == "next from Third" && self.song != 2 {
                return;
            }
            let Some(song) = self.goal(action) else {
                return;
            };
            self.armed.retain(|other| !changes_song(other));
            self.song = song;
            self.songs.push((at, song));
        }
        if changes_song(action) || action == "home" {
            self.wait = None;
            self.latched.begin_song();
            self.held
                .retain(|held| held.2.starts_with("pitch") || held.2 == "plain");
        }
        match action {
            "fresh" => {
                self.latched = Lasting::default();
                self.held.clear();
                self.armed.clear();
            }
            "home" => {
                self.latched.plain = false;
                self.held.clear();
            }
            "panic" => self.hands.clear(),
            "reload" | "stop" => self.asked += 1,
            "tonic next-key pivot" | "root next-key" => {
                let wait = Wait {
                    root: action == "root next-key",
                    sounds: false,
                    asked_by: None,
                    while_held: false,
                };
                self.wait = self.has_next_key(action).then_some(wait).or(self.wait);
            }
            _ => {
                if action == "tonic home" {
                    self.wait = None;
                }
                self.latched.take(self.song, action);
            }
        }
        if action.ends_with(" now") {
            self.moved_at.insert(at);
        }
    }

    /// A tonic that can be moved, or a root.
    fn has_next_key(&self, action: &str) -> bool {
        match action {
            "root next-key" => self.song == FOLLOWS,
            _ => self.song == 3,
        }
    }

    /// Whether chords were followed at a time.
    fn followed(&self, at: Duration) -> bool {
        let ends = self
            .songs
            .iter()
            .skip(1)
            .map(|(at, _)| *at)
            .chain([u64::MAX]);
        let mut songs = self.songs.iter().zip(ends);
        songs.any(|((from, song), to)| {
            *song == FOLLOWS
                && Duration::from_millis(*from) <= at
                && at <= Duration::from_millis(to)
        })
    }

    /// What was told for good, with what is held on top.
    fn in_force(&self) -> Lasting {
        let mut all = self.latched.clone();
        for (_, _, action) in &self.held {
            all.take(self.song, action);
        }
        all
    }
}

fn changes_song(action: &str) -> bool {
    [
        "next",
        "back",
        "song 3",
        "song Fifth",
        "next from Third",
        "fresh",
    ]
    .contains(&action)
}

/// One thing that happens, to the engine and to the model.
fn happen(dice: &mut Dice, rig: &mut Rig, model: &mut Model) {
    let at = rig.now.nanos() / 1_000_000;
    let keyboard = dice.below(2) as usize;
    match dice.below(100) {
        0..=44 => touch(dice, rig, model, keyboard),
        45..=64 => {
            let key = dice.between(45, 80) as u8;
            let hand = (keyboard, key, false);
            if model.hands.len() >= 6 || model.hands.contains(&hand) {
                return;
            }
            rig.midi(keyboard, &[0x90, key, 80]);
            if let Some(wait) = model.wait.take() {
                let tuned = i32::from(key) + model.in_force().transpose_keys(model.song);
                if wait.root {
                    model.latched.root_held = true;
                } else {
                    model.latched.move_tonic(model.song, tuned, "pivot");
                }
                if !wait.sounds {
                    rig.midi(keyboard, &[0x80, key, 64]);
                    return model.when_quiet(at);
                }
            }
            model.hands.insert(hand);
        }
        65..=88 => {
            let played = model
                .hands
                .iter()
                .find(|hand| !hand.2 && hand.1 >= 45)
                .copied();
            if let Some((keyboard, key, _)) = played {
                rig.midi(keyboard, &[0x80, key, 64]);
                model.hands.remove(&(keyboard, key, false));
                model.when_quiet(at);
            }
        }
        89..=97 => {
            let down = !model.hands.remove(&(keyboard, 64, true));
            if down {
                model.hands.insert((keyboard, 64, true));
            }
            rig.midi(keyboard, &[0xB0, 64, u8::from(down) * 127]);
            model.when_quiet(at);
        }
        98 => {
            // What they were told before is nothing to a device that comes.
            rig.link(
                1,
                if model.lamps_away {
                    Link::Back
                } else {
                    Link::Down
                },
            );
            model.lamps_away = !model.lamps_away;
            if model.lamps_away {
                rig.lamps.clear();
            }
        }
        _ => {
            rig.input(Input::KeyboardLost(keyboard_id(keyboard)));
            model.down.retain(|place, _| place.0 != keyboard);
            model.let_go_held(at, |place| place.0 == keyboard);
            let asked = |wait: &mut Wait| wait.asked_by.is_some_and(|place| place.0 == keyboard);
            model.wait.take_if(asked);
            model.hands.retain(|hand| hand.0 != keyboard);
            model.when_quiet(at);
        }
    }
}

/// A control goes down, or comes up if it is down.
fn touch(dice: &mut Dice, rig: &mut Rig, model: &mut Model, keyboard: usize) {
    let at = rig.now.nanos() / 1_000_000;
    let index = dice.below(CONTROLS.len() as u64) as usize;
    let control = &CONTROLS[index];
    let is_down = model.down.contains_key(&(keyboard, index));
    let bytes = if is_down { control.up } else { control.down };
    rig.midi(keyboard, bytes);
    // After a panic nothing is held; what is armed still waits for a key or a controller, also one before a program.
    let stirs = |bytes: &[u8]| matches!(bytes, [0xB0 | 0x80, ..] | [0x90, _, 0]);
    if stirs(bytes) && bytes.len() > 3 {
        model.when_quiet(at);
    }
    // A key that passes is played as well.
    let hand = control.key().map(|key| (keyboard, key, false));
    if is_down {
        hand.map(|hand| model.hands.remove(&hand));
        model.let_go(at, keyboard, index);
    } else {
        if let Some(other) = control.lets_go {
            model.let_go(at, keyboard, other);
        }
        if let Some(hand) = hand.filter(|_| model.passes(index)) {
            model.hands.insert(hand);
        }
        model.press(at, keyboard, index);
    }
    if stirs(bytes) && bytes.len() == 3 {
        model.when_quiet(at);
    }
}

fn agree(rig: &Rig, model: &Model, seed: u64, text: &str) {
    let report = rig.engine.report();
    let armed_song = model.armed.iter().find(|action| changes_song(action));
    let armed_song = armed_song.and_then(|action| model.goal(action));
    let told = model.in_force();
    let wanted = (
        model.song as u16,
        told.nudge_microcents,
        told.transpose_keys(model.song),
        told.plain,
        told.tonic.is_some(),
        (told.root_held, told.sevenths),
        model.wait.is_some(),
        armed_song.map(|song| song as u16),
        model.armed.len(),
        model.asked,
    );
    let got = (
        report.song,
        report.nudge.microcents(),
        i32::from(report.transpose_keys),
        report.plain,
        report.tonic_moved,
        (
            report.root_held,
            report
                .sevenths
                .map(|sevenths| sevenths == Sevenths::Harmonic),
        ),
        report.waits_for_key,
        report.armed_song,
        usize::from(report.armed),
        rig.asked.len(),
    );
    assert_eq!(got, wanted, "seed {seed} at {:?} with\n{text}", rig.now);
    if model.lamps_away {
        assert!(rig.lamps.is_empty(), "seed {seed}");
        return;
    }
    for (number, show) in LAMPS.iter().enumerate() {
        let lit = match *show {
            "song Third" => model.song == 2,
            "tonic next-key" => model.wait.is_some_and(|wait| !wait.root),
            "root next-key" => model.wait.is_some_and(|wait| wait.root),
            show => told.shows(model.song, show),
        };
        let mut its = (rig.lamps.iter().rev())
            .filter(|sent| usize::from(sent.bytes[1]) == number)
            .map(|sent| sent.bytes[2] > 0);
        let (now, before) = (its.next(), its.next());
        assert_eq!(
            now,
            Some(lit),
            "seed {seed} at {:?}: {show} with\n{text}",
            rig.now
        );
        assert_ne!(now, before, "seed {seed}: {show} was said twice");
    }
}

fn play(seed: u64, fired: &mut BTreeSet<Fired>) -> usize {
    let mut dice = Dice::new(seed);
    let dialect = dice.pick(&["channel-bend", "mpe"]);
    let cues = some_cues(&mut dice);
    let text = stage(&cues, dialect);
    let mut rig = Rig::of(&text);
    let mut model = Model {
        cues,
        ..Model::default()
    };
    for _ in 0..300 {
        rig.until(rig.now + Span::from_millis(dice.pick(&[1, 20, 150, 420, 900])));
        model.pass_time(rig.now.nanos() / 1_000_000);
        agree(&rig, &model, seed, &text);
        let onsets = rig.onsets.len();
        happen(&mut dice, &mut rig, &mut model);
        agree(&rig, &model, seed, &text);
        let fixed = |_: &&(Time, Onset)| model.song != FOLLOWS;
        for (_, onset) in rig.onsets[onsets..].iter().filter(fixed) {
            let wanted = model.in_force().cents(model.song, onset.key.number());
            let off = (onset.target.cents() - wanted).abs();
            // Each pivot is rounded to a microcent.
            assert!(
                off < 1e-3,
                "seed {seed}: {onset:?}, not {wanted}, with\n{text}"
            );
        }
    }
    for keyboard in 0..2 {
        model.let_go_held(rig.now.nanos() / 1_000_000, |place| place.0 == keyboard);
        rig.input(Input::KeyboardLost(keyboard_id(keyboard)));
    }
    let heard = rig.heard();
    assert!(heard.stuck().is_empty(), "seed {seed}: {:?}", heard.stuck());
    assert!(heard.orphans.is_empty(), "seed {seed}: {:?}", heard.orphans);
    for moved in heard.moves.iter().filter(|m| m.hold == Hold::Held) {
        let by_us = model
            .moved_at
            .iter()
            .any(|at| Duration::from_millis(*at) == moved.at);
        let by_chord = model.followed(moved.at);
        assert!(by_us || by_chord, "seed {seed}: {moved:?} with\n{text}");
    }
    fired.append(&mut model.fired);
    heard.notes.len()
}

/// Six hundred, or as many as `SEEDS` says for a long run.
#[test]
fn every_form_of_a_cue_does_what_the_language_says() {
    let many = std::env::var("SEEDS").ok().and_then(|n| n.parse().ok());
    let seeds = 1..=many.unwrap_or(600u64);
    let mut fired = BTreeSet::new();
    let notes: usize = seeds.clone().map(|seed| play(seed, &mut fired)).sum();
    println!(
        "{} evenings of 300 gestures, {notes} notes, {} of control, form and action together",
        seeds.count(),
        fired.len()
    );
    assert!(notes > 1_000);
    // Every control, and every form, with every action.
    for action in ACTIONS {
        for (place, control) in CONTROLS.iter().enumerate() {
            let met = fired.iter().any(|(c, _, a)| (*c, *a) == (place, action));
            assert!(met, "{action} never by {:?}", control.when);
        }
        let forms = forms(0).into_iter().chain(["once"]);
        for form in forms.filter(|form| *form != "held" || can_be_held(action)) {
            let met = fired.iter().any(|(_, f, a)| (*f, *a) == (form, action));
            assert!(met, "{action} never by {form}");
        }
    }
}
