//! Ports in memory, on simulated time: a script in, what was sent out. For tests.

use super::outbox::{Outbox, RETRY, outboxes};
use super::{Backend, Broken, Cycle, Inbox, Link, Next, Outlet, Wire};
use crate::time::{Span, Time};

/// One thing that happens at a scripted time.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Step {
    Midi {
        keyboard: usize,
        bytes: Vec<u8>,
    },
    KeyboardLost {
        keyboard: usize,
    },
    Synth {
        synth: usize,
        link: Link,
    },
    /// The synth's port takes so many messages from now on, then no more.
    Takes {
        synth: usize,
        messages: usize,
    },
}

/// A message as it left.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Sent {
    pub time: Time,
    pub synth: usize,
    pub bytes: Vec<u8>,
}

/// The backend. Time jumps from one event or deadline to the next.
pub struct Loopback {
    script: Vec<(Time, Step)>,
    /// When to stop even if the cycle wants to go on.
    end: Time,
    outboxes: Vec<Outbox>,
    wire: Recorder,
}

struct Recorder {
    now: Time,
    takes: Vec<usize>,
    sent: Vec<Sent>,
}

impl Loopback {
    /// The script must be in order of time.
    pub fn new(synths: usize, script: Vec<(Time, Step)>, end: Time) -> Loopback {
        Loopback {
            script,
            end,
            outboxes: outboxes(synths),
            wire: Recorder {
                now: Time::START,
                takes: vec![usize::MAX; synths],
                sent: Vec::new(),
            },
        }
    }

    /// Everything that left, in order.
    pub fn sent(&self) -> &[Sent] {
        &self.wire.sent
    }
}

impl Backend for Loopback {
    fn run(&mut self, cycle: &mut dyn Cycle) -> Result<(), Broken> {
        let mut inbox = Inbox::new();
        let mut script = std::mem::take(&mut self.script).into_iter().peekable();
        let mut now = Time::START;
        while now <= self.end {
            self.wire.now = now;
            while let Some((time, step)) = script.next_if(|(time, _)| *time <= now) {
                self.wire.take_step(time, step, &mut inbox);
            }
            let mut outlet = Outlet {
                outboxes: &mut self.outboxes,
                wire: &mut self.wire,
            };
            outlet.retry();
            let next = cycle.run(now, &mut inbox, &mut outlet);
            let retry = outlet.is_waiting().then(|| now + RETRY);
            inbox.clear();
            let Next::Wait(deadline) = next else {
                return Ok(());
            };
            let event = script.peek().map(|(time, _)| *time);
            let Some(then) = [deadline, event, retry].into_iter().flatten().min() else {
                return Ok(());
            };
            // A deadline that is due already must not stop time.
            now = then.max(now + Span::from_nanos(1));
        }
        Ok(())
    }
}

impl Recorder {
    fn take_step(&mut self, time: Time, step: Step, inbox: &mut Inbox) {
        match step {
            Step::Midi { keyboard, bytes } => {
                assert!(inbox.add_midi(time, keyboard, &bytes), "too much at once");
            }
            Step::KeyboardLost { keyboard } => inbox.add_keyboard_lost(time, keyboard),
            Step::Synth { synth, link } => inbox.add_synth(time, synth, link),
            Step::Takes { synth, messages } => self.takes[synth] = messages,
        }
    }
}

impl Wire for Recorder {
    fn write(&mut self, synth: usize, bytes: &[u8]) -> usize {
        let mut rest = bytes;
        while let Some((message, more)) = super::message::cut(rest) {
            if self.takes[synth] == 0 {
                break;
            }
            self.takes[synth] -= 1;
            self.sent.push(Sent {
                time: self.now,
                synth,
                bytes: message.to_vec(),
            });
            rest = more;
        }
        bytes.len() - rest.len()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ports::{Weight, What};

    /// Sends what it hears back out, and a clock tick every 10 ms.
    struct Echo {
        tick: Time,
    }

    impl Cycle for Echo {
        fn run(&mut self, to: Time, inbox: &mut Inbox, outlet: &mut Outlet<'_>) -> Next {
            for (_, what) in inbox.sorted() {
                if let What::Midi { bytes, .. } = what {
                    outlet.send(0, Weight::Note, bytes);
                }
            }
            if to >= self.tick {
                outlet.send(0, Weight::Through, &[0xF8]);
                self.tick = to + Span::from_millis(10);
            }
            Next::Wait(Some(self.tick))
        }
    }

    #[test]
    fn events_deadlines_and_a_full_port_on_simulated_time() {
        let at = Time::from_millis;
        let note = |key| Step::Midi {
            keyboard: 0,
            bytes: vec![0x90, key, 100],
        };
        let takes = |messages| Step::Takes { synth: 0, messages };
        let script = vec![
            (at(1), note(60)),
            (at(12), takes(0)),
            (at(13), note(61)),
            (at(17), takes(usize::MAX)),
        ];
        let mut loopback = Loopback::new(1, script, at(25));
        loopback.run(&mut Echo { tick: at(5) }).unwrap();
        let heard: Vec<_> = loopback
            .sent()
            .iter()
            .map(|sent| (sent.time, sent.bytes[0], sent.bytes.get(1).copied()))
            .collect();
        assert_eq!(
            heard,
            [
                (at(1), 0x90, Some(60)),
                (at(5), 0xF8, None),
                (at(17), 0x90, Some(61)),
                (at(17), 0xF8, None),
                (at(25), 0xF8, None)
            ]
        );
    }
}
