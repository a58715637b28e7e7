//! A player and a recorder around trued.

use super::processes::wait_for;
use crate::support::receiver::Receiver;
use jack::{
    AsyncClient, Client, ClientOptions, Control, MidiIn, MidiOut, Port, ProcessScope, RawMidi,
};
use std::cell::RefCell;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::time::Duration;

/// A short message at a frame.
#[derive(Clone, Copy, Debug)]
pub struct Event {
    pub frame: u64,
    bytes: [u8; 3],
    length: usize,
}

impl Event {
    pub fn new(frame: u64, message: &[u8]) -> Event {
        let mut bytes = [0; 3];
        bytes[..message.len()].copy_from_slice(message);
        Event {
            frame,
            bytes,
            length: message.len(),
        }
    }

    pub fn bytes(&self) -> &[u8] {
        &self.bytes[..self.length]
    }
}

/// What both ways brought, by frames of the server.
pub struct Heard {
    pub direct: Vec<Event>,
    pub through: Vec<Event>,
    /// What a second synth heard, if there was one.
    pub second: Vec<Event>,
    pub xruns: u64,
}

struct Playing {
    out: Port<MidiOut>,
    score: rtrb::Consumer<Event>,
    /// Frames since the first event was there.
    position: Option<u64>,
    done: Arc<AtomicBool>,
}

impl jack::ProcessHandler for Playing {
    fn process(&mut self, _: &Client, scope: &ProcessScope) -> Control {
        let mut writer = self.out.writer(scope);
        if self.position.is_none() && self.score.is_empty() {
            return Control::Continue;
        }
        let begin = self.position.unwrap_or(0);
        let end = begin + u64::from(scope.n_frames());
        while let Ok(event) = self.score.peek().copied() {
            if event.frame >= end {
                break;
            }
            let time = event.frame.saturating_sub(begin) as u32;
            let bytes = event.bytes();
            if writer.write(&RawMidi { time, bytes }).is_err() {
                break;
            }
            let _ = self.score.pop();
        }
        self.position = Some(end);
        self.done.store(self.score.is_empty(), Ordering::Release);
        Control::Continue
    }
}

struct Recording {
    direct: Port<MidiIn>,
    through: Port<MidiIn>,
    second: Port<MidiIn>,
    heard: [rtrb::Producer<Event>; 3],
}

impl jack::ProcessHandler for Recording {
    fn process(&mut self, _: &Client, scope: &ProcessScope) -> Control {
        let cycle = u64::from(scope.last_frame_time());
        for (port, heard) in [&self.direct, &self.through, &self.second]
            .into_iter()
            .zip(&mut self.heard)
        {
            for event in port.iter(scope) {
                // Sysex is nothing that this test sends.
                if event.bytes.len() <= 3 {
                    let frame = cycle + u64::from(event.time);
                    heard.push(Event::new(frame, event.bytes)).expect("room");
                }
            }
        }
        Control::Continue
    }
}

struct Xruns(Arc<AtomicU64>);

impl jack::NotificationHandler for Xruns {
    fn xrun(&mut self, _: &Client) -> Control {
        self.0.fetch_add(1, Ordering::Relaxed);
        Control::Continue
    }
}

impl Prepared {
    pub fn activate(self) -> Bench {
        let ((player, playing), (recorder, recording)) = (self.player, self.recorder);
        let xruns = Arc::new(AtomicU64::new(0));
        let player = player.activate_async((), playing).expect("active");
        let recorder = recorder
            .activate_async(Xruns(xruns.clone()), recording)
            .expect("active");
        let client = recorder.as_client();
        client
            .connect_ports_by_name("Player:out", "recorder:direct")
            .expect("connected");
        Bench {
            player,
            recorder,
            score: RefCell::new(self.score),
            heard: RefCell::new(self.heard),
            done: self.done,
            xruns,
        }
    }
}

/// `Player:out` to `recorder:direct` by a connection, to `recorder:through` and `recorder:second` by trued.
pub struct Bench {
    player: AsyncClient<(), Playing>,
    recorder: AsyncClient<Xruns, Recording>,
    score: RefCell<rtrb::Producer<Event>>,
    heard: RefCell<[rtrb::Consumer<Event>; 3]>,
    done: Arc<AtomicBool>,
    xruns: Arc<AtomicU64>,
}

/// Clients with all their ports, not active yet.
pub struct Prepared {
    player: (Client, Playing),
    recorder: (Client, Recording),
    score: rtrb::Producer<Event>,
    heard: [rtrb::Consumer<Event>; 3],
    done: Arc<AtomicBool>,
}

impl Bench {
    pub fn open() -> Bench {
        Bench::prepare().activate()
    }

    pub fn prepare() -> Prepared {
        let open = |name| {
            Client::new(name, ClientOptions::NO_START_SERVER)
                .expect("a server")
                .0
        };
        let (score, score_out) = rtrb::RingBuffer::new(100_000);
        let (heard_direct, direct) = rtrb::RingBuffer::new(200_000);
        let (heard_through, through) = rtrb::RingBuffer::new(200_000);
        let (heard_second, second) = rtrb::RingBuffer::new(200_000);
        let done = Arc::new(AtomicBool::new(false));
        let player = open("Player");
        let playing = Playing {
            out: player
                .register_port("out", MidiOut::default())
                .expect("a port"),
            score: score_out,
            position: None,
            done: done.clone(),
        };
        let recorder = open("recorder");
        let port = |name| {
            recorder
                .register_port(name, MidiIn::default())
                .expect("a port")
        };
        let recording = Recording {
            direct: port("direct"),
            through: port("through"),
            second: port("second"),
            heard: [heard_direct, heard_through, heard_second],
        };
        Prepared {
            player: (player, playing),
            recorder: (recorder, recording),
            score,
            heard: [direct, through, second],
            done,
        }
    }

    /// trued does it by itself.
    pub fn wait_until_connected(&self) {
        wait_for("trued to connect", || {
            self.connections("Player:out") >= 2 && self.connections("recorder:through") >= 1
        });
    }

    pub fn connections(&self, port: &str) -> usize {
        let port = self.player.as_client().port_by_name(port);
        port.and_then(|port| port.connected_count().ok())
            .unwrap_or(0)
    }

    /// By hand, as soon as its ports are there.
    pub fn connect_to(&self, name: &str) {
        let client = self.player.as_client();
        let (keys, organ) = (format!("{name}:keys"), format!("{name}:organ"));
        wait_for("its ports", || {
            client.connect_ports_by_name("Player:out", &keys).is_ok()
        });
        wait_for("its ports", || {
            client
                .connect_ports_by_name(&organ, "recorder:through")
                .is_ok()
        });
    }

    /// Begins to play; frames count from the first cycle on.
    pub fn begin(&self, events: &[Event]) {
        let mut score = self.score.borrow_mut();
        self.done.store(false, Ordering::Release);
        for event in events {
            score.push(*event).expect("room");
        }
    }

    /// Plays to the end, and a little longer.
    pub fn play(&self, events: &[Event]) {
        self.begin(events);
        wait_for("the last event", || self.done.load(Ordering::Acquire));
        std::thread::sleep(Duration::from_millis(300));
    }

    /// Hands what came through to a receiver.
    pub fn hear(&self, receiver: &mut Receiver) {
        while let Ok(event) = self.heard.borrow_mut()[1].pop() {
            receiver.hear(Duration::ZERO, event.bytes());
        }
    }

    pub fn finish(self) -> Heard {
        let _ = self.player.deactivate();
        let _ = self.recorder.deactivate();
        let [mut direct, mut through, mut second] = self.heard.into_inner();
        Heard {
            direct: std::iter::from_fn(|| direct.pop().ok()).collect(),
            through: std::iter::from_fn(|| through.pop().ok()).collect(),
            second: std::iter::from_fn(|| second.pop().ok()).collect(),
            xruns: self.xruns.load(Ordering::Relaxed),
        }
    }
}
