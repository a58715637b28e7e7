//! The desk's front side: what people and the supervisor are told, and what people ask for.

use super::orders::Orders;
use super::score::Pulse;
use super::socket::{ClientId, Form, Request, Socket};
use super::status::Status;
use super::systemd::Systemd;
use super::tell::outcome;
use crate::engine::{Ask, Command, Report, Told};
use crate::ports::clock::Clock;
use crate::ports::system::{Bell, readable, wait};
use crate::stage::Stage;
use crate::stage::expression::Mistake;
use crate::stage::words::Words;
use crate::time::{Span, Time};
use rtrb::Consumer;
use std::sync::Arc;
use tracing::info;

/// How long an order may take before whoever gave it is told that the score thread does not answer.
const PATIENCE: Span = Span::from_millis(2_000);
/// How often those who follow hear of changes at most.
const FOLLOW: Span = Span::from_millis(100);
/// How often to look whether an order has been followed.
const SOON: Span = Span::from_millis(2);

pub struct Front {
    /// Kept by the desk.
    pub status: Status,
    /// What `tell` goes by.
    stage: Arc<Stage>,
    /// Ends a wait early.
    bell: Bell,
    /// As those who follow know it.
    shown: Status,
    shown_at: Time,
    socket: Option<Socket>,
    systemd: Systemd,
    /// The end has begun; nothing else is said to the supervisor.
    stopping: bool,
    pulses: Consumer<Pulse>,
    obeyed: u64,
    /// As of the last pulse: what was told, and the plans that the score had taken over.
    pub told: Option<(Told, u64)>,
    /// A pulse has come since the supervisor was last told that we live.
    alive: bool,
    waiting: Vec<Waiting>,
    clock: Clock,
    began: Time,
}

/// An order that has been given and not yet followed.
struct Waiting {
    client: ClientId,
    order: u64,
    command: Command,
    before: Report,
    given_at: Time,
}

impl Front {
    pub fn new(
        stage: Arc<Stage>,
        status: Status,
        socket: Option<Socket>,
        systemd: Systemd,
        pulses: Consumer<Pulse>,
        bell: Bell,
    ) -> Front {
        let clock = Clock::start();
        let began = clock.now();
        Front {
            shown: status.clone(),
            shown_at: began,
            status,
            stage,
            bell,
            socket,
            systemd,
            stopping: false,
            pulses,
            obeyed: 0,
            told: None,
            alive: false,
            waiting: Vec::new(),
            clock,
            began,
        }
    }

    /// Ports are open, the engine waits; or a reload is over.
    pub fn ready(&mut self) {
        if !self.stopping {
            self.systemd.status(&self.status.line());
            self.systemd.ready();
        }
    }

    /// Another text of the stage file is in force from now on.
    pub fn show_stage(&mut self, stage: Arc<Stage>) {
        let titles = stage.set.iter().map(|song| song.title.clone());
        self.status.titles = titles.collect();
        self.status.places = stage.place_names();
        self.status.stage.clone_from(&stage.name);
        self.stage = stage;
    }

    /// The stage file is being read again; `ready` follows.
    pub fn reloading(&self) {
        if !self.stopping {
            self.systemd.reloading();
        }
    }

    /// Begins the end.
    pub fn stop(&mut self, orders: &mut Orders) {
        self.say_stopping();
        // A full queue holds a stop already, or nobody takes it.
        let _ = orders.give(Command::Stop);
    }

    fn say_stopping(&mut self) {
        if !std::mem::replace(&mut self.stopping, true) {
            info!("stopping: notes off, then tails die away");
            self.systemd.stopping();
        }
    }

    /// One look: waits until somebody asks something, the bell rings or the time is over, then answers. Gives whoever asked for a
    /// reload; they wait for `answer`.
    pub fn look(&mut self, at_most: Span, orders: &mut Orders) -> Vec<ClientId> {
        // Nothing rings here when an order has been followed.
        let at_most = if self.waiting.is_empty() {
            at_most
        } else {
            SOON
        };
        match &mut self.socket {
            Some(socket) => socket.wait(&self.bell, at_most),
            // Waited too short is a look too many.
            None => drop(wait(&mut [readable(self.bell.fd())], Some(at_most))),
        }
        self.bell.hush();
        self.take_pulses();
        self.answer_waiting();
        let requests = self.socket.as_mut().map_or(Vec::new(), Socket::requests);
        let mut reloads = Vec::new();
        for (client, request) in requests {
            match request {
                Request::Tell(words) => match self.tell(client, &words, orders) {
                    Ok(Some(client)) => reloads.push(client),
                    Ok(None) => {}
                    Err((code, text)) => self.answer(client, code, &text),
                },
                Request::Status(form) => self.answer_more(client, &self.shown_in(form)),
                Request::Follow(form) => self.follow(client, form),
            }
        }
        self.tell_changes();
        reloads
    }

    /// The score thread has left: whoever told it to stop hears that it did.
    pub fn close(&mut self) {
        self.take_pulses();
        self.answer_waiting();
    }

    pub fn answer(&mut self, to: ClientId, code: u8, text: &str) {
        if let Some(socket) = &mut self.socket {
            socket.answer(to, code, text, "");
        }
    }

    fn answer_more(&mut self, to: ClientId, more: &str) {
        if let Some(socket) = &mut self.socket {
            socket.answer(to, 0, "", more);
        }
    }

    fn take_pulses(&mut self) {
        while let Ok(pulse) = self.pulses.pop() {
            self.status.report = pulse.report;
            self.obeyed = pulse.obeyed;
            self.told = Some((pulse.told, pulse.plans));
            (self.status.waited, self.status.dropped) = (pulse.waited, pulse.dropped);
            self.alive = true;
        }
        if self.alive && self.systemd.ping(self.clock.now()) {
            self.alive = false;
        }
    }

    /// Gives the order that the words mean. `Some` if it is a reload.
    fn tell(
        &mut self,
        client: ClientId,
        words: &str,
        orders: &mut Orders,
    ) -> Result<Option<ClientId>, (u8, String)> {
        let wrong = |mistake: Mistake| (64, format!("{}; {}", mistake.wrong, mistake.right));
        let words = Words::parse(words).map_err(wrong)?;
        let command = match self.stage.resolve(&words).map_err(wrong)? {
            Command::Ask(Ask::Reload) => return Ok(Some(client)),
            Command::Ask(Ask::Stop) => {
                self.say_stopping();
                Command::Stop
            }
            command => command,
        };
        let stuck = || (69, "the score thread does not answer".to_string());
        let order = orders.give(command).ok_or_else(stuck)?;
        self.waiting.push(Waiting {
            client,
            order,
            command,
            before: self.status.report,
            given_at: self.clock.now(),
        });
        Ok(None)
    }

    /// Answers those whose order has been followed, or has not been for too long.
    fn answer_waiting(&mut self) {
        let now = self.clock.now();
        for waiting in std::mem::take(&mut self.waiting) {
            if waiting.order <= self.obeyed {
                match outcome(waiting.command, &waiting.before, &self.status) {
                    Ok(text) => self.answer(waiting.client, 0, &text),
                    Err(text) => self.answer(waiting.client, 64, &text),
                }
            } else if now.since(waiting.given_at) > PATIENCE {
                self.answer(waiting.client, 69, "the score thread does not answer");
            } else {
                self.waiting.push(waiting);
            }
        }
    }

    fn shown_in(&self, form: Form) -> String {
        let uptime_s = self.clock.now().since(self.began).nanos() / 1_000_000_000;
        match form {
            Form::Text => self.status.text(uptime_s),
            Form::Json => format!("{}\n", self.status.json(uptime_s)),
        }
    }

    fn follow(&mut self, client: ClientId, form: Form) {
        self.tell_changes_now();
        self.answer_more(client, &self.shown_in(form));
        if let Some(socket) = &mut self.socket {
            socket.begin_to_follow(client, form);
        }
    }

    fn tell_changes(&mut self) {
        if self.clock.now().since(self.shown_at) >= FOLLOW {
            self.tell_changes_now();
        }
    }

    fn tell_changes_now(&mut self) {
        self.shown_at = self.clock.now();
        let changes = self.status.changes(&self.shown);
        if changes.is_empty() {
            return;
        }
        self.shown = self.status.clone();
        self.systemd.status(&self.status.line());
        let object = self.shown_in(Form::Json);
        if let Some(socket) = &mut self.socket {
            socket.tell_followers(Form::Text, &(changes.join("\n") + "\n"));
            socket.tell_followers(Form::Json, &object);
        }
    }
}
