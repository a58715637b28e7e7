//! What is said once words of `tell` have been followed.

use super::by_hand;
use super::status::{Status, cents};
use crate::engine::{Command, Report};

/// What came of a command, by what was so before it.
///
/// # Errors
/// It could not be followed.
pub fn outcome(command: Command, before: &Report, now: &Status) -> Result<String, String> {
    let report = &now.report;
    let moved = before.song != report.song;
    let is_first = report.song == 0;
    let is_last = usize::from(report.song) + 1 >= now.titles.len();
    match command {
        Command::NextFrom(place) if before.song != place => {
            let title = now
                .titles
                .get(usize::from(place))
                .map_or("", String::as_str);
            Err(format!(
                "{title} is not the song now; it is {}",
                now.song_shown()
            ))
        }
        Command::Next | Command::NextFrom(_) if !moved => Err(unmoved(is_last, "after", now)),
        Command::Back if !moved => Err(unmoved(is_first, "before", now)),
        Command::Song(_) | Command::Next | Command::NextFrom(_) | Command::Back => {
            Ok(now.song_shown())
        }
        Command::Pitch { .. } => Ok(format!(
            "all is {:+.3} c from its pitch",
            cents(report.nudge)
        )),
        Command::Transpose(_) => Ok(format!("keys are moved by {:+}", report.transpose_keys)),
        Command::Plain if report.plain => Ok("plain: equal temperament".to_string()),
        Command::Plain => Ok(format!("as the songs say: {}", now.song_shown())),
        Command::Inflect { .. }
        | Command::InflectHome
        | Command::Turn(_)
        | Command::BlackKey(_)
        | Command::Tonic { .. }
        | Command::TonicNextKey(_)
        | Command::TonicAt(_)
        | Command::TonicHome
        | Command::Root(_)
        | Command::RootNextKey
        | Command::Sevenths(_) => by_hand(command, before, now),
        Command::Home => Ok(format!("as it begins: {}", now.song_shown())),
        Command::Fresh => Ok(format!("as if started anew: {}", now.song_shown())),
        Command::Panic => Ok("all is silenced, and every synth set up again".to_string()),
        Command::Resend(None) => Ok("every synth is set up again".to_string()),
        Command::Resend(Some(synth)) => {
            let synth = now.synths.get(synth.index());
            let name = synth.map_or("", |synth| synth.name.as_str());
            Ok(format!("{name} is set up again"))
        }
        Command::Stop => Ok("stopping: notes off, then tails die away".to_string()),
        Command::End => Ok("notes off".to_string()),
        Command::Ask(_) => Ok("passed on".to_string()),
    }
}

fn by_hand(command: Command, before: &Report, now: &Status) -> Result<String, String> {
    if now.report.counters.ignored == before.counters.ignored {
        let changed = by_hand::sentences(&now.report, &now.places);
        return Ok(match changed.is_empty() {
            true => "nothing is changed by hand".to_string(),
            false => changed.join(" "),
        });
    }
    let song = now.song_shown();
    Err(match command {
        Command::Tonic { .. }
        | Command::TonicNextKey(_)
        | Command::TonicAt(_)
        | Command::TonicHome => match now.report.tonic {
            None => format!(
                "the tuning goes by letter: its keys keep their pitches whatever the tonic; {song}"
            ),
            Some(_) => {
                format!("the tonic cannot go there: a key that is needed for it is silent; {song}")
            }
        },
        Command::BlackKey(name) => {
            format!("no black key may be {name} or something else in {song}")
        }
        Command::Root(_) | Command::RootNextKey | Command::Sevenths(_) => {
            format!("no harmony is followed (`intonation: fixed`) in {song}")
        }
        Command::Turn(_) => format!("there is no such turn in {song}"),
        _ => format!("that key has no such place, or is as far from it as it goes, in {song}"),
    })
}

/// Why a step to another song was none.
fn unmoved(at_the_end: bool, side: &str, now: &Status) -> String {
    let song = now.song_shown();
    if at_the_end {
        return format!("nothing comes {side} {song}");
    }
    format!("the song has only just changed, so that was taken for a double press; still {song}")
}
