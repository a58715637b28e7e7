//! A controller with buttons and lights of its own on a real server.

use super::bench::{Bench, Event};
use super::processes::{Server, Trued, in_a_process_of_its_own, wait_for};
use jack::{
    AsyncClient, Client, ClientOptions, Control, MidiIn, MidiOut, Port, ProcessScope, RawMidi,
};
use std::time::Duration;

const STAGE: &str = r#"
stage: Lamp check
keyboards:
  keys: {port: "Player:*"}
  pads: {port: "Pads:*", channel: 10}
synths:
  organ: {port: "recorder:through", tail_ms: 50}
cues:
  - {when: {program: any, channel: 16, from: keys}, do: song}
  - {when: {note: D2, from: pads}, do: plain, while: held}
lamps:
  - {show: plain, send: {note: E2, to: pads}}
  - {show: song Harbour tag, send: {controller: 20, to: pads, value: 5}}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
  - {song: Harbour tag, tuning: equal-12}
"#;

struct Device {
    buttons: Port<MidiOut>,
    lights: Port<MidiIn>,
    pressed: rtrb::Consumer<[u8; 3]>,
    shown: rtrb::Producer<[u8; 3]>,
}

impl jack::ProcessHandler for Device {
    fn process(&mut self, _: &Client, scope: &ProcessScope) -> Control {
        let mut writer = self.buttons.writer(scope);
        while let Ok(bytes) = self.pressed.pop() {
            let written = writer.write(&RawMidi {
                time: 0,
                bytes: &bytes,
            });
            written.expect("room");
        }
        for event in self.lights.iter(scope) {
            let bytes = event.bytes.try_into().expect("lamps are short messages");
            self.shown.push(bytes).expect("room");
        }
        Control::Continue
    }
}

struct Pads {
    _client: AsyncClient<(), Device>,
    press: rtrb::Producer<[u8; 3]>,
    shown: rtrb::Consumer<[u8; 3]>,
}

impl Pads {
    fn plug_in() -> Pads {
        let (client, _) = Client::new("Pads", ClientOptions::NO_START_SERVER).expect("a server");
        let (press, pressed) = rtrb::RingBuffer::new(64);
        let (show, shown) = rtrb::RingBuffer::new(1_024);
        let device = Device {
            buttons: client
                .register_port("buttons", MidiOut::default())
                .expect("a port"),
            lights: client
                .register_port("lights", MidiIn::default())
                .expect("a port"),
            pressed,
            shown: show,
        };
        Pads {
            _client: client.activate_async((), device).expect("active"),
            press,
            shown,
        }
    }

    /// Waits until these messages have come, and for a while whether more come.
    fn shows(&mut self, wanted: &[[u8; 3]]) {
        let mut shown = Vec::new();
        wait_for("the lamps", || {
            shown.extend(std::iter::from_fn(|| self.shown.pop().ok()));
            shown.len() >= wanted.len()
        });
        std::thread::sleep(Duration::from_millis(100));
        shown.extend(std::iter::from_fn(|| self.shown.pop().ok()));
        assert_eq!(shown, wanted);
    }
}

#[test]
fn lamps_follow_come_back_with_their_device_and_go_out_at_the_end() {
    in_a_process_of_its_own(
        "lamps::lamps_follow_come_back_with_their_device_and_go_out_at_the_end",
        || {
            let _server = Server::start(256);
            // The lamps come with an edit, and with them a port more.
            let without = STAGE.replace("lamps:", "").replace("  - {show", "#");
            let trued = Trued::start(&without);
            let bench = Bench::open();
            bench.wait_until_connected();
            let mut pads = Pads::plug_in();
            wait_for("the pads", || {
                trued.log().contains("keyboard pads is connected to")
            });
            trued.edit(STAGE);
            pads.shows(&[[0x89, 40, 0], [0xB9, 20, 0]]);
            bench.wait_until_connected();
            bench.play(&[Event::new(100, &[0xCF, 1])]);
            pads.shows(&[[0xB9, 20, 5]]);
            pads.press.push([0x99, 38, 90]).expect("room");
            pads.shows(&[[0x99, 40, 127]]);
            // Unplugged with the button down: what it held is let go, and when it is back all is said again.
            drop(pads);
            wait_for("trued to notice", || {
                let log = trued.log();
                log.contains("pads lamps has gone") && log.contains("keyboard pads has gone")
            });
            let mut pads = Pads::plug_in();
            pads.shows(&[[0x89, 40, 0], [0xB9, 20, 5]]);
            // Longer than the time after which a synth's set-up is said once more.
            std::thread::sleep(Duration::from_millis(2_500));
            pads.shows(&[]);
            // With the lamp goes its light.
            trued.edit(&without);
            pads.shows(&[[0xB9, 20, 0]]);
            trued.edit(STAGE);
            pads.shows(&[[0x89, 40, 0], [0xB9, 20, 5]]);
            trued.stop_cleanly();
            pads.shows(&[[0xB9, 20, 0]]);
        },
    );
}
