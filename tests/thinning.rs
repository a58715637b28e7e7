//! A slow wire: gestures are thinned to what it carries, the newest value always arrives, and no note waits or is lost.

use crate::support::plans;
use crate::support::rig::Rig;
use trued::engine::Weight;
use trued::engine::plan::Dialect;
use trued::time::{Span, Time};

/// A DIN cable: 31,250 baud, ten bits a byte (from memory, as common practice).
const DIN_BYTES_PER_S: u32 = 3_125;

/// Ten held notes of ten pitches; wheel, pressure and a controller two hundred times a second for two seconds.
fn play(dialect: Dialect, bytes_per_s: Option<u32>) -> Rig {
    let mut synth = plans::synth("organ", dialect, 12);
    synth.bytes_per_s = bytes_per_s;
    let offsets = std::array::from_fn(|key| key as f64 * 3.0);
    let set = vec![plans::song("Slow wire", plans::offsets(offsets))];
    let mut rig = Rig::ready(&plans::plan(synth, set));
    rig.until(Time::from_millis(1_000));
    for key in 60..70 {
        rig.midi(0, &[0x90, key, 80]);
    }
    for step in 0..400u32 {
        rig.until(rig.now + Span::from_millis(5));
        let value = (step % 128) as u8;
        rig.midi(0, &[0xE0, value, value]);
        rig.midi(0, &[0xD0, value]);
        rig.midi(0, &[0xB0, 11, value]);
        if step % 50 == 0 {
            rig.midi(0, &[0x90, 80, 80]);
            rig.midi(0, &[0x80, 80, 64]);
        }
    }
    rig.until(rig.now + Span::from_millis(1_000));
    rig
}

/// The most bytes that went out within a second from the first gesture on.
fn bytes_in_busiest_second(rig: &Rig) -> usize {
    let gestures = rig.sent.iter().filter(|s| s.at > Time::from_millis(1_000));
    let all: Vec<_> = gestures.map(|s| (s.at, s.bytes.len())).collect();
    let from = |first: Time| {
        let within = all
            .iter()
            .filter(move |(at, _)| *at >= first && *at < first + Span::from_millis(1_000));
        within.map(|(_, bytes)| bytes).sum::<usize>()
    };
    all.iter().map(|(at, _)| from(*at)).max().unwrap_or(0)
}

#[test]
fn a_slow_wire_gets_what_it_can_carry_and_the_newest_value() {
    for dialect in [Dialect::ChannelBend, Dialect::Mpe { manager: 0 }] {
        let rig = play(dialect, Some(DIN_BYTES_PER_S));
        let busiest = bytes_in_busiest_second(&rig);
        // What a key itself needs is never thinned: a note, its note-off, and the controllers its channel has missed.
        assert!(
            busiest <= DIN_BYTES_PER_S as usize + 200,
            "{dialect:?}: {busiest} bytes in a second"
        );
        assert_eq!(rig.engine.report().counters.notes, 18, "{dialect:?}");
        let last = (399 % 128) as u8;
        let heard = rig.heard();
        let governor = match dialect {
            Dialect::Mpe { manager } => manager,
            Dialect::ChannelBend => heard.notes[0].channel,
        };
        assert_eq!(heard.controller(governor, 11), Some(last), "{dialect:?}");
        assert_eq!(heard.pressure(governor), last, "{dialect:?}");
        // The wheel's last place, (15 x 129 - 8192) steps of a range of 2 semitones, is in every note.
        let wheel_cents = (last as f64 * 129.0 - 8192.0) * 200.0 / 8192.0;
        for note in heard.notes.iter().take(10) {
            let moved = note.cents() - note.onset_cents();
            assert!((moved - wheel_cents).abs() < 0.2, "{dialect:?}: {note:?}");
        }
    }
}

#[test]
fn without_a_speed_nothing_is_thinned() {
    let rig = play(Dialect::Mpe { manager: 0 }, None);
    let gestures = rig.sent.iter().filter(|s| s.weight == Weight::Control);
    assert!(gestures.count() >= 3 * 399);
}
