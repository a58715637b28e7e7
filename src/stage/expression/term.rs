//! One term of a sum: ratio, cents, power, part of a comma, frequency.

use super::token::{Decimal, Token};
use super::{COMMA_NAMES, COMMAS, FORMS, Mistake, bounded};
use crate::pitch::{Hertz, Log};
use crate::stage::node::nearest;

/// What a term comes to.
pub enum Term {
    Distance(Log),
    Hertz(Hertz),
}

/// Takes one term off the front.
///
/// # Errors
/// What is wrong with it.
pub fn term(rest: &mut &[Token]) -> Result<Term, Mistake> {
    let (term, used) = match rest {
        [
            Token::Number(over),
            Token::Mark('/'),
            Token::Number(under),
            Token::Word(comma),
            after @ ..,
        ] if after.is_empty() || !matches!(comma.as_str(), "narrow" | "wide") => {
            (Term::Distance(part(over, under, comma)?), 4)
        }
        [
            Token::Number(over),
            Token::Mark('/'),
            Token::Number(under),
            ..,
        ] => (Term::Distance(ratio(over, under)?), 3),
        [Token::Number(base), Token::Mark('^'), after @ ..] => {
            let (exponent, used) = exponent(after)?;
            (
                Term::Distance(power(ratio(base, &one())?, exponent)?),
                2 + used,
            )
        }
        [
            Token::Mark('('),
            Token::Number(over),
            Token::Mark('/'),
            Token::Number(under),
            Token::Mark(')'),
            Token::Mark('^'),
            after @ ..,
        ] => {
            let (exponent, used) = exponent(after)?;
            (
                Term::Distance(power(ratio(over, under)?, exponent)?),
                6 + used,
            )
        }
        [Token::Number(number), Token::Word(unit), ..] => (with_unit(number, unit)?, 2),
        [Token::Number(number), ..] => return Err(no_unit(number)),
        [Token::Word(word), ..] => return Err(unknown_word(word)),
        [Token::Mark(mark), ..] => {
            return Err(Mistake::new(format!("`{mark}` stands alone here"), FORMS));
        }
        [] => return Err(Mistake::new("the pitch breaks off after a sign", FORMS)),
    };
    *rest = &rest[used..];
    Ok(term)
}

fn one() -> Decimal {
    Decimal {
        typed: "1".to_string(),
        digits: 1,
        decimals: 0,
    }
}

fn ratio(over: &Decimal, under: &Decimal) -> Result<Log, Mistake> {
    match (over.whole(), under.whole()) {
        (Some(over), Some(under)) if over > 0 && under > 0 => Ok(Log::of_ratio(over, under)),
        (Some(_), Some(_)) => Err(Mistake::new(
            format!("`{}/{}` has a zero in it", over.typed, under.typed),
            "a ratio is of whole numbers from 1; no change at all is 1/1",
        )),
        _ => Err(Mistake::new(
            format!("`{}/{}` is not of whole numbers", over.typed, under.typed),
            "write a ratio such as 3/2",
        )),
    }
}

/// `1/4 syntonic`: a part of a comma. `3/2 c` and `1/4 narrow` are slips.
fn part(over: &Decimal, under: &Decimal, word: &str) -> Result<Log, Mistake> {
    if word == "narrow" || word == "wide" {
        return Err(Mistake::new(
            format!(
                "`{}/{} {word}` is the wrong way round",
                over.typed, under.typed
            ),
            format!("write `{word} {}/{} syntonic`", over.typed, under.typed),
        ));
    }
    if word == "c" || word.eq_ignore_ascii_case("hz") {
        return Err(Mistake::new(
            format!(
                "`{}/{} {word}` is a ratio with a unit",
                over.typed, under.typed
            ),
            format!("leave out `{word}`, or write a number before it in place of the ratio"),
        ));
    }
    let Some((_, above, below)) = COMMAS.iter().find(|(name, ..)| *name == word) else {
        return Err(unknown_comma(word));
    };
    let (over, under) = (
        over.small("a part of a comma")?,
        under.small("a part of a comma")?,
    );
    if under == 0 {
        return Err(Mistake::new(
            "a comma is divided by zero",
            "write a part such as 1/4",
        ));
    }
    Ok(Log::of_ratio(*above, *below).part(over, under))
}

/// Reads `(7/12)`, `(-1/4)`, `7` or `(7)`; tells how many tokens it took.
fn exponent(tokens: &[Token]) -> Result<((i64, i64), usize), Mistake> {
    let bad = || {
        Mistake::new(
            "the power breaks off after `^`",
            "write its exponent in brackets: 2^(7/12)",
        )
    };
    let what = "an exponent";
    if let [Token::Number(number), after @ ..] = tokens {
        if let [Token::Mark('/'), ..] = after {
            return Err(Mistake::new(
                "the exponent has no brackets",
                "write it as 2^(7/12)",
            ));
        }
        return Ok(((number.small(what)?, 1), 1));
    }
    let [Token::Mark('('), inside @ ..] = tokens else {
        return Err(bad());
    };
    let (down, inside, signs) = match inside {
        [Token::Mark('-'), after @ ..] => (-1, after, 1),
        _ => (1, inside, 0),
    };
    match inside {
        [Token::Number(over), Token::Mark(')'), ..] => {
            Ok(((down * over.small(what)?, 1), 3 + signs))
        }
        [
            Token::Number(over),
            Token::Mark('/'),
            Token::Number(under),
            Token::Mark(')'),
            ..,
        ] => match under.small(what)? {
            0 => Err(Mistake::new(
                "the exponent has a zero below",
                "write it as 2^(7/12)",
            )),
            under => Ok(((down * over.small(what)?, under), 5 + signs)),
        },
        _ => Err(bad()),
    }
}

fn power(base: Log, (over, under): (i64, i64)) -> Result<Log, Mistake> {
    let power = base.part(over, under);
    bounded(power)?;
    Ok(power)
}

fn with_unit(number: &Decimal, unit: &str) -> Result<Term, Mistake> {
    if unit == "c" {
        return Ok(Term::Distance(number.cents()?));
    }
    if unit.eq_ignore_ascii_case("hz") {
        return Ok(Term::Hertz(number.hertz()?));
    }
    if let Some((_, above, below)) = COMMAS.iter().find(|(name, ..)| *name == unit) {
        let count = number.small("a count of commas")?;
        return Ok(Term::Distance(Log::of_ratio(*above, *below).times(count)));
    }
    if unit == "narrow" || unit == "wide" {
        return Err(no_unit(number));
    }
    if unit.to_ascii_lowercase().starts_with("cent") || unit == "C" || unit == "ct" {
        return Err(Mistake::new(
            format!("`{unit}` is not how cents are written"),
            format!("write `{} c`", number.typed),
        ));
    }
    Err(unknown_comma(unit))
}

fn no_unit(number: &Decimal) -> Mistake {
    let as_ratio = match number.whole() {
        Some(_) => format!("`{}/1`", number.typed),
        None => "such as 3/2".to_string(),
    };
    Mistake::new(
        format!("`{}` has no unit", number.typed),
        format!("cents are written `{} c`, a ratio {as_ratio}", number.typed),
    )
}

fn unknown_word(word: &str) -> Mistake {
    if COMMA_NAMES.contains(&word) {
        return Mistake::new(
            format!("`{word}` has no part before it"),
            format!("say how much of it: `narrow 1/4 {word}`"),
        );
    }
    let known = ["narrow", "wide", "syntonic", "pythagorean", "schisma"];
    match nearest(word, &known) {
        Some(near) => Mistake::new(
            format!("`{word}` is not known in a pitch"),
            format!("did you mean `{near}`?"),
        ),
        None => Mistake::new(format!("`{word}` is not known in a pitch"), FORMS),
    }
}

fn unknown_comma(word: &str) -> Mistake {
    let right = match nearest(&word.to_lowercase(), &COMMA_NAMES) {
        Some(near) => format!("did you mean `{near}`?"),
        None => "the units are c and Hz, the commas syntonic, pythagorean and schisma".to_string(),
    };
    Mistake::new(format!("`{word}` is neither a unit nor a comma"), right)
}
