//! Edits while playing: reads the stage files again when they have changed, and hands a good one to the score thread.
//!
//! A bad one changes nothing but what log and status say. One plan at a time is under way; when the old one has come
//! back, the new one is in force.

use super::rig::{Moved, RigWanted};
use super::score::Handover;
use super::state::{Boot, Keeper};
use super::status::Status;
use crate::engine::Plan;
use crate::stage::Stage;
use crate::stage::complaint::Complaint;
use crate::stage::watch::{Wake, Watch};
use crate::time::{Span, Time};
use rtrb::{Consumer, Producer};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, PoisonError};
use tracing::{info, warn};

/// How often to look when nothing happens.
const LOOK: Span = Span::from_millis(50);
/// How often to look whether a plan is in force.
const SOON: Span = Span::from_millis(2);

/// How the stage file stands, for status.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct StageNews {
    pub file: PathBuf,
    /// What is wrong with the file as it is now, one complaint a line; empty if nothing is.
    pub complaints: Vec<String>,
    /// Since when, by the desk's clock.
    pub bad_since: Option<Time>,
    /// When the last good edit came into force, by the desk's clock.
    pub reloaded_at: Option<Time>,
    /// Good edits that came into force.
    pub reloads: u64,
    /// What plays is the copy of the last good text, because the file was bad when trued started.
    pub from_copy: bool,
}

/// The desk's ends of the two queues.
pub struct Handing {
    pub plans: Producer<Handover>,
    pub old: Consumer<Box<Plan>>,
}

/// What the desk has to do after a look.
#[derive(Debug, PartialEq, Eq)]
pub enum Todo {
    Nothing,
    /// Wake the score thread: a plan waits for it.
    Ring,
    /// The new plan is in force: connect what has changed.
    InForce(Moved),
}

pub struct Reload {
    path: PathBuf,
    watch: Watch,
    keeper: Keeper,
    handing: Handing,
    /// In force, or under way to it.
    stage: Arc<Stage>,
    /// Good as well, and newer: its turn comes when nothing is under way.
    next: Option<Stage>,
    under_way: Option<Moved>,
    asked: bool,
    /// The files are to be read at this look.
    due: bool,
    /// Whether ports of devices that stay are the same after an edit of the others.
    keeps_ports: bool,
    news: Arc<Mutex<StageNews>>,
}

impl Reload {
    /// `boot`: what plays already. Its file may have been bad; then that is told as with any edit.
    /// `wake`: called when it is time for a look.
    pub fn new(boot: Boot, handing: Handing, now: Time, wake: Wake) -> Reload {
        let news = StageNews {
            file: boot.path.clone(),
            from_copy: !boot.complaints.is_empty(),
            ..StageNews::default()
        };
        let mut reload = Reload {
            watch: Watch::new(&boot.stage.files, now, wake),
            path: boot.path,
            keeper: boot.keeper,
            handing,
            stage: Arc::new(boot.stage),
            next: None,
            under_way: None,
            asked: false,
            due: false,
            keeps_ports: false,
            news: Arc::new(Mutex::new(news)),
        };
        match boot.complaints.is_empty() {
            true => reload.keeper.keep(&reload.stage, now),
            false => reload.is_bad(&boot.complaints, now),
        }
        reload
    }

    /// Devices that stay as they are play on while others come or go: the backend can do so.
    #[must_use]
    pub fn keeping_ports(self, keeps_ports: bool) -> Reload {
        Reload {
            keeps_ports,
            ..self
        }
    }

    pub fn keeps_ports(&self) -> bool {
        self.keeps_ports
    }

    pub fn news(&self) -> Arc<Mutex<StageNews>> {
        self.news.clone()
    }

    /// For whoever answers questions about the daemon.
    pub fn show(&self, status: &mut Status) {
        status.complaint = self.complaint();
        let news = self.news.lock().unwrap_or_else(PoisonError::into_inner);
        (status.from_copy, status.reloads) = (news.from_copy, news.reloads);
    }

    /// What is in force, or about to be.
    pub fn stage(&self) -> Arc<Stage> {
        self.stage.clone()
    }

    /// What is wrong with the file as it is now, a complaint a line.
    pub fn complaint(&self) -> Option<String> {
        let news = self.news.lock().unwrap_or_else(PoisonError::into_inner);
        (!news.complaints.is_empty()).then(|| news.complaints.join("\n"))
    }

    /// How many plans have come into force after the first, if none is under way.
    pub fn plans_in_force(&self) -> Option<u64> {
        let news = self.news.lock().unwrap_or_else(PoisonError::into_inner);
        self.under_way.is_none().then_some(news.reloads)
    }

    /// Whether all that was asked for has been read, and is in force if it is good.
    pub fn is_settled(&self) -> bool {
        !self.asked && !self.due && self.next.is_none() && self.under_way.is_none()
    }

    /// SIGHUP or `tell reload`: the files are read at the next look, whether they have changed or not.
    pub fn ask(&mut self) {
        self.asked = true;
    }

    /// Whether a reload begins: the files have changed, or somebody has asked. To be called before each look.
    pub fn begins(&mut self, now: Time) -> bool {
        let begins = self.watch.is_due(now) || self.asked;
        self.due = begins || self.watch.tries_again(now);
        begins
    }

    /// How long the next look may wait.
    pub fn patience(&self, now: Time) -> Span {
        let read_in = self.watch.due_at().map(|due| due.since(now));
        let back_in = self.under_way.as_ref().map(|_| SOON);
        let soonest = [read_in, back_in].into_iter().flatten().min();
        soonest.unwrap_or(LOOK).min(LOOK)
    }

    /// To be called a few times a second, and when `wake` was.
    pub fn look(&mut self, now: Time) -> Todo {
        if std::mem::take(&mut self.due) {
            let asked = std::mem::take(&mut self.asked);
            self.read(asked, now);
        }
        if let Some(remark) = self.watch.remark() {
            warn!("{remark}");
        }
        self.keeper.look(now);
        if let Ok(old) = self.handing.old.pop() {
            drop(old);
            if let Some(moved) = self.under_way.take() {
                self.is_in_force(now);
                return Todo::InForce(moved);
            }
        }
        if self.under_way.is_none() && self.hand_over() {
            return Todo::Ring;
        }
        Todo::Nothing
    }

    /// Writes down what has not been kept yet.
    pub fn finish(&mut self) {
        self.keeper.finish();
    }

    fn read(&mut self, asked: bool, now: Time) {
        let newest: &Stage = self.next.as_ref().unwrap_or(&self.stage);
        match Stage::read(&self.path) {
            Ok(stage) => {
                let same = (&stage.files, &stage.texts) == (&newest.files, &newest.texts);
                self.watch.follow(&stage.files, true);
                self.is_good(same, asked);
                self.keeper.keep(&stage, now);
                if !same {
                    self.next = Some(stage);
                }
            }
            Err(complaints) => {
                // What the file names may be missing or wrong; it need not be among the files of the stage in force.
                let mut files = newest.files.clone();
                for complaint in &complaints {
                    if !files.contains(&complaint.file) {
                        files.push(complaint.file.clone());
                    }
                }
                self.watch.follow(&files, false);
                self.is_bad(&complaints, now);
            }
        }
    }

    fn is_good(&mut self, same: bool, asked: bool) {
        let mut news = self.news.lock().unwrap_or_else(PoisonError::into_inner);
        let was_bad = !news.complaints.is_empty();
        news.complaints.clear();
        news.bad_since = None;
        news.from_copy &= !same;
        match (same, was_bad, asked) {
            (true, true, _) => info!("the stage file is again as it is being played"),
            (true, false, true) => info!("the stage file is as it is being played"),
            _ => {}
        }
    }

    /// Says each list of complaints once, however often it is found.
    fn is_bad(&mut self, complaints: &[Complaint], now: Time) {
        let lines: Vec<String> = complaints.iter().map(Complaint::to_string).collect();
        let mut news = self.news.lock().unwrap_or_else(PoisonError::into_inner);
        if news.complaints == lines {
            return;
        }
        match news.from_copy {
            true => warn!("the stage file cannot be used; what it was when last good is played:"),
            false => warn!("the stage file cannot be used; what is played goes on as it is:"),
        }
        for line in &lines {
            warn!("{line}");
        }
        news.complaints = lines;
        news.bad_since.get_or_insert(now);
    }

    /// True if a plan went out.
    fn hand_over(&mut self) -> bool {
        let Some(stage) = self.next.take() else {
            return false;
        };
        let moved = Moved::between(&RigWanted::of(&self.stage), &RigWanted::of(&stage));
        let handover = Handover {
            plan: stage.plan(),
            keyboards: moved.keyboards.gone,
            synths: moved.synths.gone,
            ports: moved.renamed(),
            all: moved.renamed() && !self.keeps_ports,
        };
        // Nothing is under way, so there is room.
        if self.handing.plans.push(handover).is_err() {
            self.next = Some(stage);
            return false;
        }
        self.stage = Arc::new(stage);
        self.under_way = Some(moved);
        true
    }

    fn is_in_force(&mut self, now: Time) {
        let mut news = self.news.lock().unwrap_or_else(PoisonError::into_inner);
        news.reloads += 1;
        news.reloaded_at = Some(now);
        news.from_copy = false;
        info!("{} is in force as it is now", shown(&self.path));
    }
}

fn shown(path: &Path) -> String {
    path.file_name()
        .map_or_else(|| path.display(), |name| Path::new(name).display())
        .to_string()
}
