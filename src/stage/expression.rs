//! Pitch expressions: `3/2`, `701.955 c`, `2^(7/12)`, `narrow 1/4 syntonic`, `261.63 Hz`, and sums of them.
//!
//! Whole numbers all the way: decimals are read as fractions, sums are taken in [`Log`] and rounded by whoever sounds
//! them. `narrow` and `wide` are minus and plus, so `3/2 narrow 1/4 syntonic` needs no rule of its own.

mod term;
mod token;

use crate::pitch::{Hertz, Interval, Log};
use crate::tuning::Key;
use term::{Term, term};
use token::{Token, tokens};

/// What an expression comes to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Expression {
    /// A distance: above the tonic, from pure, from equal, as the field has it.
    Distance(Log),
    /// A frequency, with whatever was added to it.
    Absolute(Hertz, Log),
}

/// What is wrong with an expression and what would be right.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Mistake {
    pub wrong: String,
    pub right: String,
}

impl Mistake {
    fn new(wrong: impl Into<String>, right: impl Into<String>) -> Mistake {
        Mistake {
            wrong: wrong.into(),
            right: right.into(),
        }
    }
}

/// The commas, as ratios.
pub const COMMAS: [(&str, u64, u64); 3] = [
    ("syntonic", 81, 80),
    ("pythagorean", 531_441, 524_288),
    ("schisma", 32_805, 32_768),
];
const COMMA_NAMES: [&str; 3] = ["syntonic", "pythagorean", "schisma"];
const FORMS: &str = "a pitch is written 3/2, 701.955 c, 2^(7/12), narrow 1/4 syntonic or 261.63 Hz, or a sum of these";
/// Numbers in exponents and parts of commas.
const SMALL_MAX: u64 = 9_999;
/// Twenty octaves: twice the keyboard.
const OCTAVES_MAX: i64 = 20;
const HERTZ_MAX: u64 = 100_000;

impl Expression {
    /// Reads an expression.
    ///
    /// # Errors
    /// The first thing wrong with it.
    pub fn parse(text: &str) -> Result<Expression, Mistake> {
        let tokens = tokens(text)?;
        if tokens.is_empty() {
            return Err(Mistake::new("no pitch is written here", FORMS));
        }
        let mut rest = &tokens[..];
        let mut sum = Log::ZERO;
        let mut hertz = None;
        while !rest.is_empty() {
            let first = rest.len() == tokens.len();
            let down = sign(&mut rest, first)?;
            match term(&mut rest)? {
                Term::Distance(log) => sum = if down { sum - log } else { sum + log },
                Term::Hertz(_) if down => {
                    return Err(Mistake::new(
                        "a frequency is taken away here",
                        "write the frequency first, then what is added to it or taken away",
                    ));
                }
                Term::Hertz(found) => {
                    if hertz.replace(found).is_some() {
                        return Err(Mistake::new("two frequencies are added here", "keep one"));
                    }
                }
            }
            bounded(sum)?;
        }
        Ok(match hertz {
            Some(hertz) => Expression::Absolute(hertz, sum),
            None => Expression::Distance(sum),
        })
    }

    /// As `parse`, where a frequency makes no sense.
    ///
    /// # Errors
    /// The first thing wrong with it.
    pub fn distance(text: &str) -> Result<Log, Mistake> {
        match Expression::parse(text)? {
            Expression::Distance(log) => Ok(log),
            Expression::Absolute(..) => Err(Mistake::new(
                format!("`{text}` is a frequency, and a distance belongs here"),
                "write a ratio, cents, or a part of a comma",
            )),
        }
    }
}

/// Reads `415 Hz`, `415.3 Hz` or `415`.
///
/// # Errors
/// What is wrong with it.
pub fn hertz(text: &str) -> Result<Hertz, Mistake> {
    let right = "write it as `415 Hz`";
    let tokens = tokens(text)?;
    match &tokens[..] {
        [Token::Number(number)] => number.hertz(),
        [Token::Number(number), Token::Word(unit)] if unit.eq_ignore_ascii_case("hz") => {
            number.hertz()
        }
        [Token::Number(_), Token::Word(unit)] => Err(Mistake::new(
            format!("`{unit}` is not a unit of frequency"),
            right,
        )),
        _ => Err(Mistake::new(format!("`{text}` is not a frequency"), right)),
    }
}

/// Reads a reference: `A4 = 415 Hz`, `C4 = 256`, or a frequency alone, which is of A4.
///
/// # Errors
/// What is wrong with it.
pub fn reference(text: &str) -> Result<(Key, Hertz), Mistake> {
    let Some((key, frequency)) = text.split_once('=') else {
        return Ok((Key::A4, hertz(text)?));
    };
    let key = Key::parse(key.trim()).ok_or_else(|| {
        Mistake::new(
            format!("`{}` is not a key with its octave", key.trim()),
            "write it as `A4 = 415 Hz`",
        )
    })?;
    Ok((key, hertz(frequency)?))
}

/// How far a fifth (or any interval) is from pure, as one would type it: `pure`, `narrow 1/4 syntonic`, `wide 35.7 c`.
pub fn narrow_or_wide(from_pure: Interval) -> String {
    let direction = match from_pure.microcents() {
        -2..=2 => return "pure".to_string(), // each end may be a microcent off
        negative if negative < 0 => "narrow",
        _ => "wide",
    };
    match part_of_comma(from_pure.abs()) {
        Some(part) => format!("{direction} {part}"),
        None => format!("{direction} {:.1} c", from_pure.abs().cents()),
    }
}

/// `1/4 syntonic`, where a size is a simple part of a comma. Two pitches are rounded to make it, hence the microcent.
fn part_of_comma(size: Interval) -> Option<String> {
    let close = |log: Log| (log.interval() - size).abs().microcents() <= 1;
    let comma = |index: usize| Log::of_ratio(COMMAS[index].1, COMMAS[index].2);
    for under in [1, 2, 3, 4, 5, 6, 7, 8, 10, 12, 16] {
        for over in 1..=under.min(3) {
            let simple = over == 1 || under % over != 0;
            for (index, (name, ..)) in COMMAS.iter().enumerate() {
                if simple && close(comma(index).part(over, under)) {
                    let part = if under == 1 {
                        "1".to_string()
                    } else {
                        format!("{over}/{under}")
                    };
                    return Some(format!("{part} {name}"));
                }
            }
        }
    }
    None
}

fn too_far() -> Mistake {
    Mistake::new(
        format!("this reaches further than {OCTAVES_MAX} octaves"),
        "check the numbers",
    )
}

fn bounded(sum: Log) -> Result<(), Mistake> {
    let limit = Log::OCTAVE.times(OCTAVES_MAX);
    if sum > limit || sum < -limit {
        return Err(too_far());
    }
    Ok(())
}

/// Takes `+`, `-`, `narrow` or `wide`; true for down. The first term may go without.
fn sign(rest: &mut &[Token], first: bool) -> Result<bool, Mistake> {
    let down = match rest.first() {
        Some(Token::Mark('+')) => false,
        Some(Token::Mark('-')) => true,
        Some(Token::Word(word)) if word == "wide" => false,
        Some(Token::Word(word)) if word == "narrow" => true,
        _ if first => return Ok(false),
        other => {
            let shown = other.map(show).unwrap_or_default();
            return Err(Mistake::new(
                format!("`{shown}` follows without + or -"),
                "join terms with + or -, narrow or wide",
            ));
        }
    };
    *rest = &rest[1..];
    Ok(down)
}

fn show(token: &Token) -> String {
    match token {
        Token::Number(number) => number.typed.clone(),
        Token::Word(word) => word.clone(),
        Token::Mark(mark) => mark.to_string(),
    }
}

#[cfg(test)]
#[path = "expression_tests.rs"]
mod tests;
