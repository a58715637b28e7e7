//! What may happen to a server or a client of it on an evening, and the end of one, on a real JACK server.

use super::bench::{Bench, Event};
use super::processes::{Server, Trued, in_a_process_of_its_own, wait_for};
use super::{HALF_STEP_CENTS, STAGE, wanted_cents};
use crate::support::receiver::{Kind, Receiver};
use std::time::Duration;

/// Hardware behind the server; strange at power-on, so that a range never told is heard.
fn hardware() -> Receiver {
    Receiver::new(Kind::Plain, Duration::ZERO, 7)
}

fn hold(bench: &Bench, receiver: &mut Receiver, keys: &[u8]) {
    let at = |(n, key): (usize, &u8)| Event::new(100 + n as u64, &[0x90, *key, 99]);
    bench.begin(&keys.iter().enumerate().map(at).collect::<Vec<_>>());
    wait_for("the chord", || {
        bench.hear(receiver);
        receiver.sounding().len() == keys.len()
    });
}

#[test]
fn a_server_that_stands_still_is_told_of_and_the_score_lives() {
    in_a_process_of_its_own(
        "trouble::a_server_that_stands_still_is_told_of_and_the_score_lives",
        || {
            let server = Server::start(64);
            let (trued, supervisor) = Trued::supervised(STAGE, Duration::from_secs(1));
            let (bench, mut receiver) = (Bench::open(), hardware());
            bench.wait_until_connected();
            wait_for("a status of one who plays", || {
                let status = trued.status();
                status["trouble"].is_null() && status["real_time"] == server.real_time
            });
            assert_eq!(trued.status()["backend"], "jack");
            hold(&bench, &mut receiver, &[60, 64, 67]);

            let still = server.stand_still();
            wait_for("a word of it in the log", || {
                trued.log().contains("the JACK server stands still")
            });
            let trouble = "the JACK server stands still; nothing is heard or sent until it goes on";
            wait_for("the same in status", || {
                trued.status()["trouble"] == trouble
            });
            supervisor.waits_for_some("the same as the service's status", |heard| {
                heard.starts_with("STATUS=") && heard.ends_with(trouble)
            });
            // Starting trued anew would not make the server go on, so the supervisor hears that it lives; and it does.
            for _ in 0..6 {
                supervisor.waits_for("WATCHDOG=1");
            }
            assert_eq!(trued.tell("song 2"), "song 2 of 3: Harbour tag\n");

            drop(still);
            wait_for("a word of it in the log", || {
                trued.log().contains("the JACK server goes on")
            });
            wait_for("an end of the chord", || {
                bench.hear(&mut receiver);
                receiver.sounding().is_empty()
            });
            wait_for("a status without trouble", || {
                trued.status()["trouble"].is_null()
            });
            // With all it knew: the song of before is not begun again, and every channel is told its range anew.
            std::thread::sleep(Duration::from_millis(2_500));
            hold(&bench, &mut receiver, &[64]);
            let off = receiver.notes.last().expect("played").onset_cents() - wanted_cents(64, 1);
            assert!(off.abs() <= HALF_STEP_CENTS, "{off} cents off");
            trued.stop_cleanly();
            wait_for("silence", || {
                bench.hear(&mut receiver);
                receiver.sounding().is_empty()
            });
        },
    );
}

#[test]
fn it_can_be_ended_and_begun_while_the_server_stands_still() {
    in_a_process_of_its_own(
        "trouble::it_can_be_ended_and_begun_while_the_server_stands_still",
        || {
            let server = Server::start(64);
            let trued = Trued::start(STAGE);
            let bench = Bench::open();
            bench.wait_until_connected();
            let still = server.stand_still();
            wait_for("a word of it in the log", || {
                trued.log().contains("the JACK server stands still")
            });
            trued.stop_cleanly();

            let (trued, supervisor) = Trued::supervised(STAGE, Duration::from_secs(1));
            assert_eq!(
                trued.status()["trouble"],
                "no JACK server answers; waiting for one"
            );
            for _ in 0..3 {
                supervisor.waits_for("WATCHDOG=1");
            }
            drop(still);
            bench.wait_until_connected();
            wait_for("a status without trouble", || {
                trued.status()["trouble"].is_null()
            });

            // One that is killed where it stands has gone like any other.
            let still = server.stand_still();
            wait_for("it to be noticed", || !trued.status()["trouble"].is_null());
            server.signal("KILL");
            drop(still);
            drop((bench, server));
            wait_for("its end to be noticed", || {
                trued.log().contains("has gone; waiting for one")
            });
            let _server = Server::start(64);
            Bench::open().wait_until_connected();
            trued.stop_cleanly();
        },
    );
}

#[test]
fn a_client_that_is_not_active_yet_is_tried_again() {
    in_a_process_of_its_own(
        "trouble::a_client_that_is_not_active_yet_is_tried_again",
        || {
            let _server = Server::start(64);
            let late = Bench::prepare();
            let trued = Trued::start(STAGE);
            wait_for("a word of it in the log", || {
                trued
                    .log()
                    .contains("cannot be connected to recorder:through")
            });
            late.activate().wait_until_connected();
            trued.stop_cleanly();
        },
    );
}

#[test]
fn every_end_says_so_and_leaves_nothing_sounding() {
    in_a_process_of_its_own(
        "trouble::every_end_says_so_and_leaves_nothing_sounding",
        || {
            let _server = Server::start(64);
            for signal in ["TERM", "INT"] {
                let (trued, supervisor) = Trued::supervised(STAGE, Duration::from_secs(5));
                let (bench, mut receiver) = (Bench::open(), hardware());
                bench.wait_until_connected();
                hold(&bench, &mut receiver, &[60, 63, 67]);
                bench.begin(&[Event::new(10, &[0xB0, 64, 127])]);
                trued.signal(signal);
                supervisor.waits_for("STOPPING=1");
                wait_for("note-offs", || {
                    bench.hear(&mut receiver);
                    receiver.sounding().is_empty()
                });
                trued.ends_cleanly();
                assert!(receiver.stuck().is_empty() && receiver.orphans.is_empty());
            }
        },
    );
}
