//! Numbers, words and marks of a pitch expression.

use super::{FORMS, HERTZ_MAX, Mistake, OCTAVES_MAX, SMALL_MAX, too_far};
use crate::pitch::{Hertz, Log};

/// Digits of any number, so that every fraction fits its integers.
const DIGITS_MAX: usize = 15;

#[derive(Clone, Debug, PartialEq)]
pub enum Token {
    Number(Decimal),
    Word(String),
    Mark(char),
}

/// A number as typed: `digits` less the point, `decimals` of them behind it.
#[derive(Clone, Debug, PartialEq)]
pub struct Decimal {
    pub typed: String,
    pub digits: u64,
    pub decimals: u32,
}

impl Decimal {
    pub fn whole(&self) -> Option<u64> {
        (self.decimals == 0).then_some(self.digits)
    }

    /// A whole number for a fraction or exponent.
    pub fn small(&self, what: &str) -> Result<i64, Mistake> {
        match self.whole() {
            Some(number) if number <= SMALL_MAX => Ok(number as i64),
            _ => Err(Mistake::new(
                format!("`{}` does not fit in {what}", self.typed),
                format!("write whole numbers up to {SMALL_MAX}"),
            )),
        }
    }

    pub fn cents(&self) -> Result<Log, Mistake> {
        let per_octave = 1200 * 10i64.pow(self.decimals);
        // Told before the sum is taken, so that nothing can overflow.
        if self.digits as i64 / per_octave > OCTAVES_MAX {
            return Err(too_far());
        }
        Ok(Log::OCTAVE.part(self.digits as i64, per_octave))
    }

    pub fn hertz(&self) -> Result<Hertz, Mistake> {
        let micro = if self.decimals <= 6 {
            self.digits as u128 * 10u128.pow(6 - self.decimals)
        } else {
            let scale = 10u128.pow(self.decimals - 6);
            (self.digits as u128 + scale / 2) / scale
        };
        u64::try_from(micro)
            .ok()
            .filter(|micro| *micro <= HERTZ_MAX * 1_000_000)
            .and_then(Hertz::from_micro)
            .ok_or_else(|| {
                Mistake::new(
                    format!("`{}` cannot be a frequency", self.typed),
                    format!("write hertz above 0 and up to {HERTZ_MAX}"),
                )
            })
    }
}

/// Cuts a text up.
///
/// # Errors
/// A number or a mark that can mean nothing.
pub fn tokens(text: &str) -> Result<Vec<Token>, Mistake> {
    let mut tokens = Vec::new();
    let mut chars = text.char_indices().peekable();
    while let Some((start, first)) = chars.next() {
        let mut end = start + first.len_utf8();
        let mut take_while = |wanted: fn(char) -> bool| {
            while let Some((at, next)) = chars.next_if(|(_, next)| wanted(*next)) {
                end = at + next.len_utf8();
            }
            &text[start..end]
        };
        match first {
            ' ' | '\t' => {}
            '0'..='9' | '.' => {
                let typed = take_while(|c| c.is_ascii_digit() || c == '.' || c == ',');
                tokens.push(Token::Number(number(typed)?));
            }
            '+' | '-' | '/' | '^' | '(' | ')' => tokens.push(Token::Mark(first)),
            '\u{2212}' | '\u{2013}' => tokens.push(Token::Mark('-')), // a minus or a dash pasted from a page
            _ if first.is_alphabetic() => {
                tokens.push(Token::Word(take_while(char::is_alphabetic).to_string()));
            }
            _ => {
                return Err(Mistake::new(
                    format!("`{first}` has no place in a pitch"),
                    FORMS,
                ));
            }
        }
    }
    Ok(tokens)
}

fn number(typed: &str) -> Result<Decimal, Mistake> {
    if typed.contains(',') {
        return Err(Mistake::new(
            format!("`{typed}` has a comma in it"),
            format!("decimals take a point: `{}`", typed.replace(',', ".")),
        ));
    }
    let (before, after) = typed.split_once('.').unwrap_or((typed, ""));
    let digits = format!("{before}{after}");
    if digits.is_empty() || after.contains('.') {
        return Err(Mistake::new(format!("`{typed}` is not a number"), FORMS));
    }
    if digits.len() > DIGITS_MAX {
        return Err(Mistake::new(
            format!("`{typed}` has more than {DIGITS_MAX} digits"),
            "leave some out, or write a power such as 3^53",
        ));
    }
    Ok(Decimal {
        typed: typed.to_string(),
        digits: digits.parse().expect("at most fifteen digits"),
        decimals: after.len() as u32,
    })
}
