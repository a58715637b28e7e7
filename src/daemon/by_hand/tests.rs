//! The chord in `status`, and what is answered to words about it.

use crate::daemon::status::Status;
use crate::daemon::tell::outcome;
use crate::engine::{Engine, Input, KeyboardId, Link, SynthId};
use crate::stage::Stage;
use crate::stage::words::Words;
use crate::time::{Span, Time};
use std::path::Path;

const STAGE: &str = "\
keyboards: {keys: {port: virtual}}
synths: {organ: {port: virtual, bend_range: 2}}
set:
  - {song: Followed, intonation: chord-root}
  - {song: At rest}
";

/// A second for each thing that is done.
struct Desk {
    stage: Stage,
    engine: Engine,
    now: Time,
}

impl Desk {
    fn new() -> Desk {
        let stage = Stage::parse(Path::new("stage.yaml"), STAGE);
        let stage = stage.unwrap_or_else(|complaints| panic!("{complaints:?}"));
        let mut desk = Desk {
            engine: Engine::new(stage.plan()),
            stage,
            now: Time::START,
        };
        let synth = SynthId::new(0).unwrap();
        let link = Link::Up;
        desk.input(Input::Synth { synth, link });
        desk
    }

    fn input(&mut self, input: Input<'_>) {
        self.now = self.now + Span::from_millis(1_000);
        self.engine.handle_timeout(self.now);
        while self.engine.poll_output().is_some() {}
        self.engine.handle_input(self.now, input);
        while self.engine.poll_output().is_some() {}
    }

    fn midi(&mut self, bytes: &[u8]) {
        let keyboard = KeyboardId::new(0).unwrap();
        self.input(Input::Midi { keyboard, bytes });
    }

    fn tell(&mut self, words: &str) -> Result<String, String> {
        let command = self.stage.resolve(&Words::parse(words).unwrap()).unwrap();
        let before = self.engine.report();
        self.input(Input::Command(command));
        outcome(command, &before, &self.status())
    }

    fn status(&self) -> Status {
        let file = Path::new("stage.yaml");
        Status::of(&self.stage, "trued", "loopback", file, self.engine.report())
    }

    /// The line about the chord.
    fn chord(&self) -> Option<String> {
        let text = self.status().text(0);
        let mut lines = text.lines().filter(|line| line.starts_with("The chord"));
        lines.next().map(str::to_string)
    }
}

const C_MAJOR: [u8; 9] = [0x90, 60, 90, 0x90, 64, 90, 0x90, 67, 90];
const ITS_END: [u8; 9] = [0x80, 60, 0, 0x80, 64, 0, 0x80, 67, 0];

// 5/4 is 13.686 cents under equal, 3/2 1.955 over it; with their mean at rest C is 3.910 over.
#[test]
fn the_chord_that_sounds_is_shown_with_root_shape_anchor_and_drift() {
    let mut desk = Desk::new();
    assert_eq!(desk.chord(), None);
    desk.midi(&C_MAJOR);
    assert_eq!(
        desk.chord().as_deref(),
        Some("The chord stands on C (+3.9 c from equal), 4:5:6, at rest.")
    );
    let object = desk.status().json(0);
    assert_eq!(
        (&object["root"], &object["shape"]),
        (&0.into(), &"4:5:6".into())
    );
    assert_eq!(object["anchor_cents"], 3.910);
    assert!(object["drift_cents"].as_f64().unwrap().abs() < 0.001);
    assert_eq!(object["root_held"], false);

    desk.midi(&ITS_END);
    assert_eq!(desk.chord(), None);
    desk.tell("next").unwrap();
    desk.midi(&C_MAJOR);
    assert_eq!(desk.chord(), None, "at rest no chord is followed");
    let object = desk.status().json(0);
    assert!(
        object["root"].is_null() && object["shape"].is_null() && object["anchor_cents"].is_null()
    );
    assert_eq!(object["drift_cents"], 0.0);
}

#[test]
fn words_about_root_and_sevenths_are_answered() {
    let mut desk = Desk::new();
    let done = |desk: &mut Desk, words: &str, said: &str| {
        assert_eq!(desk.tell(words).as_deref(), Ok(said), "{words}");
    };
    done(
        &mut desk,
        "root hold",
        "The root of the next chord will be held.",
    );
    desk.midi(&C_MAJOR);
    done(&mut desk, "root hold", "The root is held on C.");
    assert_eq!(desk.status().json(0)["root_held"], true);
    done(
        &mut desk,
        "sevenths harmonic",
        "The root is held on C. Sevenths are harmonic, 7/4.",
    );
    done(&mut desk, "root free", "Sevenths are harmonic, 7/4.");
    done(
        &mut desk,
        "root next-key",
        "Sevenths are harmonic, 7/4. The next key is waited for: it names the tonic or the root.",
    );
    desk.midi(&[0x90, 40, 90]);
    done(
        &mut desk,
        "sevenths plain",
        "The root is held on E. Sevenths are plain.",
    );
    desk.tell("next").unwrap();
    for words in ["root hold", "root free", "root next-key", "sevenths plain"] {
        let refused = desk.tell(words).unwrap_err();
        let says = "no harmony is followed (`intonation: fixed`) in song 2 of 2: At rest";
        assert_eq!(refused, says, "{words}");
    }
}
