//! What the listening synth makes of bytes: pitch, pedals, zones, level.

use super::*;
use crate::engine::SynthId;
use crate::engine::plan::ChannelSet;
use crate::midi::parameter;
use crate::offline::measure::{Sound, cents};
use crate::offline::retune::Synth;
use crate::pitch::Pitch;
use crate::pitch::word::{Bend, BendRange};

/// Sends bytes at milliseconds to a synth and listens.
fn sound(drums: ChannelSet, sent: &[(u64, Vec<u8>)], end_ms: u64) -> Stereo {
    let recording = Recording {
        moved: Vec::new(),
        sent: sent
            .iter()
            .map(|(ms, bytes)| Sent {
                tick: 0,
                time: Time::from_millis(*ms),
                synth: SynthId::new(0).unwrap(),
                bytes: bytes.clone().into(),
            })
            .collect(),
        notes: Vec::new(),
        end: Time::from_millis(end_ms),
        counters: Default::default(),
        synths: vec![Synth {
            name: "organ".into(),
            drums,
        }],
    };
    render(&recording)
}

fn heard(sent: &[(u64, Vec<u8>)], end_ms: u64) -> Sound {
    let stereo = sound(ChannelSet::NONE, sent, end_ms);
    Sound::new(
        stereo.left.iter().map(|s| *s as f64).collect(),
        RATE_HZ as f64,
    )
}

fn bend(channel: u8, bend: Bend) -> [u8; 3] {
    let value = bend.value();
    [0xE0 | channel, value as u8 & 0x7F, (value >> 7) as u8]
}

/// The pitch around `near`, in cents above key 0.
fn pitch_of(sound: &Sound, span_s: (f64, f64), near: Pitch) -> f64 {
    let hz = sound.partial_hz(span_s, near.hertz(), 60.0).unwrap();
    6900.0 + cents(hz, 440.0)
}

#[test]
fn a_bent_note_sounds_where_its_bytes_say_at_every_range() {
    let mut worst = 0f64;
    for semitones in [1, 2, 12, 48, 96] {
        let range = BendRange::new(semitones).unwrap();
        for key in [24u8, 36, 57, 60, 69, 84, 96] {
            for value in [0, 4000, 8000, 8192, 8193, 8400, 12_000, 16_383] {
                let by = Bend::new(value).unwrap().decode(range);
                let wanted = Pitch::of_key(key) + by;
                if by.abs() > crate::pitch::Interval::from_cents(1200) {
                    continue;
                }
                let bytes = [
                    &parameter::bend_range(3, semitones)[..],
                    &bend(3, Bend::new(value).unwrap()),
                    &[0x93, key, 100],
                ]
                .concat();
                let sound = heard(&[(0, bytes)], 700);
                let off = pitch_of(&sound, (0.2, 0.7), wanted) - wanted.cents();
                worst = worst.max(off.abs());
                // In so deep a tone half a second holds too few turns to measure finer.
                let limit = if key < 36 { 0.05 } else { 0.01 };
                assert!(
                    off.abs() < limit,
                    "range {semitones} key {key} bend {value}: {off}"
                );
            }
        }
    }
    println!("worst error of the listening synth: {worst:.5} cent");
}

#[test]
fn the_managers_wheel_is_for_all_members_and_adds_to_their_own_bend() {
    let full = Bend::new(12_288).unwrap(); // half a push: 100 cents at range 2
    let quarter = Bend::encode(
        crate::pitch::Interval::from_cents(25),
        BendRange::FORTY_EIGHT,
    )
    .0;
    let bytes = [
        &parameter::zone(0, 15)[..],
        &bend(4, quarter),
        &bend(0, full),
        &[0x94, 60, 100],
    ]
    .concat();
    let wanted = Pitch::of_key(61) + quarter.decode(BendRange::FORTY_EIGHT);
    let found = pitch_of(&heard(&[(0, bytes)], 700), (0.2, 0.7), wanted);
    assert!((found - wanted.cents()).abs() < 0.02, "{found}");
}

#[test]
fn a_member_keeps_a_released_note_where_it_was_and_a_plain_channel_does_not() {
    let away = Bend::encode(
        crate::pitch::Interval::from_cents(40),
        BendRange::FORTY_EIGHT,
    )
    .0;
    for (zone, wanted) in [(15, 6000.0), (0, 6040.0)] {
        let sent = [
            (
                0,
                [
                    &parameter::zone(0, zone)[..],
                    &parameter::bend_range(2, 48),
                    &[0xB0, 64, 127, 0xB2, 64, 127, 0x92, 60, 100],
                ]
                .concat(),
            ),
            (200, vec![0x82, 60, 64]),
            (300, bend(2, away).to_vec()),
        ];
        let found = pitch_of(&heard(&sent, 1000), (0.4, 0.9), Pitch::of_key(60));
        assert!((found - wanted).abs() < 0.2, "zone of {zone}: {found}");
    }
}

/// Loudness of a stretch.
fn level(sound: &Stereo, from_s: f64, to_s: f64) -> f32 {
    let place = |s: f64| (s * RATE_HZ as f64) as usize;
    sound.left[place(from_s)..place(to_s)]
        .iter()
        .fold(0.0, |peak, s| peak.max(s.abs()))
}

#[test]
fn pedals_hold_what_they_should_and_let_go() {
    let on = |channel: u8| vec![0x90 | channel, 60, 100];
    let off = |channel: u8| vec![0x80 | channel, 60, 64];
    let pedal = |channel: u8, number, value| vec![0xB0 | channel, number, value];
    for (name, zone, channel, pedal_channel, number, holds) in [
        ("damper", 0, 3, 3, 64, true),
        ("damper of another channel", 0, 3, 4, 64, false),
        ("sostenuto", 0, 3, 3, 66, true),
        ("manager's damper", 15, 3, 0, 64, true),
        ("member's damper in a zone", 15, 3, 3, 64, false),
        ("no pedal", 0, 3, 3, 65, false),
    ] {
        let sent = [
            (0, parameter::zone(0, zone).to_vec()),
            (0, on(channel)),
            (100, pedal(pedal_channel, number, 127)),
            (200, off(channel)),
            (1500, pedal(pedal_channel, number, 0)),
        ];
        let sound = sound(ChannelSet::NONE, &sent, 2500);
        assert_eq!(level(&sound, 1.2, 1.4) > 0.01, holds, "{name}");
        assert_eq!(level(&sound, 2.2, 2.4), 0.0, "{name}");
    }
}

#[test]
fn sostenuto_holds_only_what_was_down_when_it_came() {
    let sent = [
        (0, vec![0xB0, 66, 127]),
        (10, vec![0x90, 60, 100]),
        (200, vec![0x80, 60, 64]),
    ];
    let sound = sound(ChannelSet::NONE, &sent, 1500);
    assert!(level(&sound, 0.1, 0.2) > 0.001);
    assert_eq!(level(&sound, 1.0, 1.5), 0.0);
}

#[test]
fn two_notes_of_one_number_need_two_note_offs() {
    let sent = [
        (0, vec![0x90, 60, 100]),
        (100, vec![0x90, 60, 100]),
        (200, vec![0x80, 60, 64]),
        (2000, vec![0x80, 60, 64]),
    ];
    let sound = sound(ChannelSet::NONE, &sent, 3000);
    assert!(level(&sound, 1.5, 1.9) > 0.01);
    assert_eq!(level(&sound, 2.8, 3.0), 0.0);
}

#[test]
fn channel_ten_sounds_as_a_member_and_is_silent_as_drums() {
    let sent = [(0, vec![0x99, 60, 100])];
    assert!(level(&sound(ChannelSet::NONE, &sent, 500), 0.2, 0.4) > 0.01);
    let drums = ChannelSet::NONE.with(9);
    assert_eq!(level(&sound(drums, &sent, 500), 0.0, 0.5), 0.0);
}

#[test]
fn the_loudest_sample_is_18_db_down_and_the_first_sound_fades_in() {
    let sent = [(500, vec![0x90, 60, 100, 0x91, 64, 30, 0x92, 67, 127])];
    let sound = sound(ChannelSet::NONE, &sent, 4000);
    let peak_db = 20.0 * level(&sound, 0.0, 4.9).log10();
    assert!((peak_db + 18.0).abs() < 0.001, "{peak_db}");
    assert_eq!(level(&sound, 0.0, 0.5), 0.0);
    assert!(level(&sound, 0.5, 0.7) < 0.11 * PEAK);
    assert!(level(&sound, 1.5, 1.6) < 0.6 * PEAK);
    let mut file = std::io::Cursor::new(Vec::new());
    write_wav(&sound, &mut file).unwrap();
    let samples = file.into_inner();
    assert_eq!(samples.len(), 44 + 4 * sound.left.len());
}

#[test]
fn the_same_bytes_give_the_same_sound() {
    let sent = [
        (0, vec![0x90, 60, 100, 0x91, 64, 30]),
        (300, vec![0x80, 60, 0]),
    ];
    let once = sound(ChannelSet::NONE, &sent, 1000);
    let twice = sound(ChannelSet::NONE, &sent, 1000);
    assert!(once.left == twice.left && once.right == twice.right);
}
