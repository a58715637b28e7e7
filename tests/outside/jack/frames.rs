//! What belongs to a frame is sent at that frame, and what finds no room waits for the next cycle, on a real JACK server.

use super::bench::{Bench, Event, Heard};
use super::processes::{Server, Trued, in_a_process_of_its_own, wait_for};
use std::time::Duration;

/// Long, so that a cycle is something to be inside of: 21 ms.
const PERIOD: u32 = 1_024;
const ATTEMPTS: usize = 3;

const NUDGED: &str = r#"
stage: Deadlines
keyboards: {keys: {port: "Player:*"}}
synths: {organ: {port: "recorder:through", bend_range: 2, tail_ms: 50}}
cues:
  - {when: {controller: 82, press: long, long_ms: 300}, do: pitch +1 c now}
set:
  - {song: Lantern hymn, tuning: equal-12}
"#;
/// 300 ms at 48 kHz.
const LONG_FRAMES: u64 = 14_400;

/// A machine that skips cycles loses what is in them: then once more.
fn without_xruns(stage: &str, play: impl Fn(&Bench), judge: impl Fn(&Heard, &serde_json::Value)) {
    for attempt in 1.. {
        let _server = Server::start(PERIOD);
        let trued = Trued::start(stage);
        let bench = Bench::open();
        bench.wait_until_connected();
        // The set-up is said again 2 s after a port came.
        std::thread::sleep(Duration::from_millis(2_500));
        play(&bench);
        let status = trued.status();
        let heard = bench.finish();
        trued.stop_cleanly();
        if heard.xruns == 0 || attempt == ATTEMPTS {
            return judge(&heard, &status);
        }
    }
}

fn frames(events: &[Event], kind: u8) -> Vec<u64> {
    let is = |event: &&Event| event.bytes()[0] & 0xF0 == kind;
    events.iter().filter(is).map(|event| event.frame).collect()
}

#[test]
fn a_deadline_inside_a_cycle_is_met_at_its_frame() {
    in_a_process_of_its_own(
        "frames::a_deadline_inside_a_cycle_is_met_at_its_frame",
        || {
            const PRESSES: u64 = 12;
            let mut events = vec![Event::new(500, &[0x90, 60, 100])];
            for press in 0..PRESSES {
                // At another place of the cycle each time.
                let frame = 4_000 + press * (20 * u64::from(PERIOD) + 83);
                events.push(Event::new(frame, &[0xB0, 82, 127]));
                events.push(Event::new(frame + LONG_FRAMES + 2_000, &[0xB0, 82, 0]));
            }
            without_xruns(
                NUDGED,
                |bench| bench.play(&events),
                |heard, _| {
                    let down = |event: &&Event| event.bytes() == [0xB0, 82, 127];
                    let pressed: Vec<u64> = heard
                        .direct
                        .iter()
                        .filter(down)
                        .map(|event| event.frame)
                        .collect();
                    let onset = frames(&heard.through, 0x90)[0];
                    let mut bends = frames(&heard.through, 0xE0);
                    bends.retain(|frame| *frame > onset);
                    let wanted: Vec<u64> =
                        pressed.iter().map(|frame| frame + LONG_FRAMES).collect();
                    assert_eq!(
                        bends, wanted,
                        "the held note moves so long after each press"
                    );
                    assert_eq!(wanted.len() as u64, PRESSES);
                    println!(
                        "{PRESSES} deadlines inside cycles of {PERIOD} frames: each at its frame"
                    );
                },
            );
        },
    );
}

/// Two parts with channels of their own: what waits for the one does not bar the way of the other.
const FULL: &str = r#"
stage: Full port
keyboards:
  keys: {port: "Player:*", channel: 1}
  low: {port: "Player:*", channel: 2}
synths: {organ: {port: "recorder:through", bend_range: 2, tail_ms: 50, drums: []}}
parts:
  - {from: keys, to: organ}
  - {from: low, to: organ}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
"#;

#[test]
fn a_full_port_is_counted_tried_again_and_what_is_owed_goes_first() {
    in_a_process_of_its_own(
        "frames::a_full_port_is_counted_tried_again_and_what_is_owed_goes_first",
        || {
            // Eight keys with a bend each, so a wheel goes to eight channels; a thousand of its values in one cycle are
            // more than a port's buffer holds (32 kB, 12 bytes a message).
            const KEYS: [u8; 8] = [60, 61, 62, 63, 64, 65, 66, 67];
            const WHEELS: u64 = 1_000;
            let at = |cycle: u64, frame: u64| cycle * u64::from(PERIOD) + frame;
            let mut events = Vec::new();
            for (n, key) in KEYS.into_iter().enumerate() {
                events.push(Event::new(at(1, n as u64), &[0x90, key, 100]));
            }
            events.push(Event::new(at(1, 20), &[0x91, 36, 100]));
            for wheel in 0..WHEELS {
                let value = 8_192 + wheel * 8;
                let bytes = [0xE0, (value % 128) as u8, (value / 128) as u8];
                events.push(Event::new(at(10, wheel), &bytes));
            }
            events.push(Event::new(at(10, WHEELS + 3), &[0x81, 36, 64]));
            for (n, key) in KEYS.into_iter().enumerate() {
                events.push(Event::new(at(30, n as u64), &[0x80, key, 64]));
            }
            without_xruns(
                FULL,
                |bench| {
                    wait_for("both keyboards", || bench.connections("Player:out") >= 3);
                    bench.play(&events);
                },
                |heard, status| {
                    let offs = frames(&heard.through, 0x80);
                    assert_eq!(offs.len(), KEYS.len() + 1, "no note-off is lost");
                    assert_eq!(frames(&heard.through, 0x90).len(), KEYS.len() + 1);
                    let struck = frames(&heard.direct, 0x80)[0];
                    let low = heard
                        .through
                        .iter()
                        .position(|event| event.bytes()[0] & 0xF0 == 0x80);
                    let low = low.expect("counted above");
                    let late = heard.through[low].frame - struck;
                    assert!(late > 0, "the port was not full");
                    assert!(
                        late <= u64::from(PERIOD),
                        "{late} frames late: not in the very next cycle"
                    );
                    // Behind it come the newest values, one for each channel, all in that cycle.
                    let behind = &heard.through[low + 1..low + 1 + KEYS.len()];
                    let cycle = heard.through[low].frame;
                    assert!(
                        heard.through[low - 1].frame < cycle,
                        "nothing overtakes what is owed"
                    );
                    assert!(
                        behind
                            .iter()
                            .all(|e| e.bytes()[0] & 0xF0 == 0xE0 && e.frame == cycle)
                    );
                    let mut channels: Vec<u8> =
                        behind.iter().map(|e| e.bytes()[0] & 0x0F).collect();
                    channels.sort_unstable();
                    channels.dedup();
                    assert_eq!(channels.len(), KEYS.len());
                    let waited = status["counters"]["waited"].as_u64().expect("a count");
                    assert!(waited >= 1, "counted");
                    assert_eq!(status["counters"]["dropped"], 0);
                    println!(
                        "{} bends through a port that was full: the note-off {late} frames late and first, {waited} \
                     cycles waited",
                        frames(&heard.through, 0xE0).len()
                    );
                },
            );
        },
    );
}
