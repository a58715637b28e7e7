//! What was told of a song by hand comes back as it was: tonic, places of keys, black keys.

use super::{evening, stage_of};
use crate::support::dice::Dice;
use trued::daemon::remember::record::{Found, State, decode, encode};
use trued::engine::{Command, Engine, Input, KeyboardId, Link, Output, SynthId};
use trued::pitch::Pitch;
use trued::stage::Stage;
use trued::stage::words::Words;
use trued::time::Time;

const STAGE: &str = "
stage: Evening
keyboards: {keys: {port: virtual}}
synths: {organ: {port: virtual}}
tunings:
  bayati:
    tonic: D
    notes: {D: 1/1, E: 145 c, F: 32/27, G: 4/3, A: 3/2, Bb: 792 c, B: 850 c, C: 16/9}
    also: {E: {natural: 9/8, flat: 90 c}, G: {flat: 400 c}, B: {natural: 27/16}}
    turns: {saba: {G: flat, E: home}, wide: {E: natural, B: natural}}
  long: {fifths: {chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#, D#], each: narrow 1/4 syntonic}}
  stretched:
    pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]
    period: 1203 c
    also: {E: {low: 100/81, flat: 6/5}, B: {low: 50/27}}
set:
  - {song: Samai, tuning: bayati, begin_with: {B: natural}}
  - {song: Canzona, tuning: long, black_keys: [C#, Eb or D#, F#, G# or Ab, Bb]}
  - {song: Motet, tuning: stretched}
  - {song: Harbour tag, tuning: equal-12, intonation: chord-root}
cues:
  - {when: {controller: 80}, do: plain, while: held}
  - {when: {controller: 81}, do: inflect E natural, while: held}
  - {when: {controller: 82}, do: tonic next-key pivot}
";

const TOLD: [&str; 27] = [
    "song 1",
    "song 2",
    "song 3",
    "inflect E natural",
    "inflect E flat",
    "inflect E home",
    "inflect E low",
    "inflect B low",
    "inflect B4 low",
    "inflect E4 natural",
    "inflect E4 home",
    "inflect B home",
    "inflect B4 home",
    "inflect home",
    "inflect G3 +1.234567 c",
    "inflect G -7 c",
    "inflect C# -0.000001 c",
    "turn saba",
    "turn wide",
    "black-key D#",
    "black-key Ab",
    "black-key G#",
    "tonic G",
    "tonic C pivot",
    "tonic Bb equal",
    "tonic home",
    "home",
];

fn command(stage: &Stage, words: &str) -> Command {
    let parsed = Words::parse(words).unwrap_or_else(|wrong| panic!("{words}: {wrong:?}"));
    let command = stage.resolve(&parsed);
    command.unwrap_or_else(|wrong| panic!("{words}: {wrong:?}"))
}

fn follow(engine: &mut Engine, command: Command) {
    engine.handle_input(Time::START, Input::Command(command));
    while engine.poll_output().is_some() {}
}

fn play(engine: &mut Engine, bytes: &[u8]) {
    let keyboard = KeyboardId::new(0).expect("the first");
    engine.handle_input(Time::START, Input::Midi { keyboard, bytes });
    while engine.poll_output().is_some() {}
}

fn state_of(engine: &Engine, stage: &Stage) -> State {
    let titles: Vec<String> = stage.set.iter().map(|song| song.title.clone()).collect();
    let names = stage.place_names();
    State::of(engine.report().song, &engine.told(), &titles, &names)
}

/// As a daemon does it at its start.
fn resumed(stage: &Stage, state: &State) -> Engine {
    let mut engine = Engine::new(stage.plan());
    for command in state.commands() {
        follow(&mut engine, command);
    }
    for words in &state.by_hand {
        follow(&mut engine, command(stage, words));
    }
    engine
}

/// What each key about the middle sounds; `None` where it is silent.
fn sounds(mut engine: Engine) -> Vec<Option<Pitch>> {
    engine.keep_records();
    let keyboard = KeyboardId::new(0).expect("the first");
    let (synth, link) = (SynthId::new(0).expect("the first"), Link::Up);
    engine.handle_input(Time::START, Input::Synth { synth, link });
    while engine.poll_output().is_some() {}
    let key = |key: u8| {
        let bytes = &[0x90, key, 64];
        engine.handle_input(Time::START, Input::Midi { keyboard, bytes });
        let mut sounds = None;
        while let Some(output) = engine.poll_output() {
            if let Output::Onset(onset) = output {
                sounds = Some(onset.target);
            }
        }
        play(&mut engine, &[0x80, key, 64]);
        sounds
    };
    (55..75).map(key).collect()
}

#[test]
fn whatever_was_told_a_restart_ends_up_there() {
    let stage = stage_of(STAGE);
    let (mut with_tonic, mut with_places, mut with_names) = (0, 0, 0);
    for seed in 0..150 {
        let mut dice = Dice::new(seed);
        let mut engine = Engine::new(stage.plan());
        for _ in 0..dice.between(1, 12) {
            follow(&mut engine, command(&stage, dice.pick(&TOLD)));
            if dice.percent(10) {
                // The tonic of a key far from the middle, of which no name tells.
                play(&mut engine, &[0xB0, 82, 127, 0xB0, 82, 0]);
                let key = dice.between(30, 90) as u8;
                play(&mut engine, &[0x90, key, 64, 0x80, key, 64]);
            }
        }
        let state = state_of(&engine, &stage);
        let Found::Good(_, read) = decode(&encode(&evening(), &state)) else {
            panic!("seed {seed}: {state:?}");
        };
        assert_eq!(read, state);
        let again = resumed(&stage, &read);
        assert_eq!(again.told(), engine.told(), "seed {seed}: {state:?}");
        assert_eq!(again.report().counters.ignored, 0, "seed {seed}: {state:?}");
        let far = |engine: &Engine| engine.report().tonic_from_home;
        assert_eq!(far(&again), far(&engine), "seed {seed}: {state:?}");
        assert!(!engine.report().waits_for_key);
        assert_eq!(sounds(again), sounds(engine), "seed {seed}: {state:?}");
        with_tonic += usize::from(state.tonic.is_some());
        let has = |start: &str| state.by_hand.iter().any(|words| words.starts_with(start));
        with_places += usize::from(has("inflect "));
        with_names += usize::from(has("black-key "));
    }
    let counts = [with_tonic, with_places, with_names];
    assert!(counts.iter().all(|count| *count > 5), "{counts:?}");
}

#[test]
fn what_a_control_holds_is_up_after_a_restart() {
    let stage = stage_of(STAGE);
    let mut engine = Engine::new(stage.plan());
    follow(&mut engine, command(&stage, "inflect G -7 c"));
    let before = state_of(&engine, &stage);
    assert_eq!(before.by_hand, ["inflect G -7 c"]);
    play(&mut engine, &[0xB0, 80, 127, 0xB0, 81, 127, 0xB0, 64, 127]);
    assert!(engine.report().plain && engine.report().off_home().count() == 3);
    assert_eq!(state_of(&engine, &stage), before);
    let again = resumed(&stage, &before).report();
    assert!(
        !again.plain && again.off_home().count() == 2,
        "B as the song begins, G as told"
    );
}

#[test]
fn it_is_announced_in_the_words_it_was_told_in() {
    let stage = stage_of(STAGE);
    let mut engine = Engine::new(stage.plan());
    for words in [
        "song 3",
        "pitch +13 c",
        "inflect B low",
        "inflect G3 +1.5 c",
        "tonic G",
    ] {
        follow(&mut engine, command(&stage, words));
    }
    let words = "song 3 \"Motet\", pitch +13 c, tonic G, inflect B low, inflect G3 +1.5 c";
    assert_eq!(state_of(&engine, &stage).words(), words);
    follow(&mut engine, command(&stage, "tonic D pivot"));
    assert!(
        state_of(&engine, &stage)
            .words()
            .contains("pitch +13 c, tonic D4, inflect")
    );
}

#[test]
fn sevenths_come_back_where_the_song_has_any() {
    let stage = stage_of(STAGE);
    for (song, by_hand) in [("song 4", &["sevenths harmonic"][..]), ("song 3", &[])] {
        let mut engine = Engine::new(stage.plan());
        follow(&mut engine, command(&stage, song));
        follow(&mut engine, command(&stage, "sevenths harmonic"));
        let state = state_of(&engine, &stage);
        assert_eq!(state.by_hand, by_hand);
        assert_eq!(resumed(&stage, &state).told(), engine.told());
    }
}

#[test]
fn a_place_that_is_no_more_is_left_out_and_the_rest_comes_back() {
    let folder = crate::control::stand::Folder::new("remembered-by-hand");
    let (file, stage) = (folder.at("stage.yaml"), stage_of(STAGE));
    let memory = || trued::daemon::remember::Memory::new(&file, "trued", Some(&folder.at("state")));
    let mut engine = Engine::new(stage.plan());
    for words in ["inflect E natural", "inflect B home", "inflect G -7 c"] {
        follow(&mut engine, command(&stage, words));
    }
    let mut first = memory();
    first.look(Time::START, "Evening", state_of(&engine, &stage));
    first.finish(Time::START);
    let all = memory().resume(&stage).commands;
    assert_eq!(all.len(), 3);
    let edited = stage_of(&STAGE.replace("natural", "plain"));
    let left = memory().resume(&edited).commands;
    assert_eq!(left, all[1..]);
}
