//! What YAML's own errors mean to a player.
//!
//! serde_yaml says where it stumbled and what it was doing; what was meant is read from the line itself.

type Place = (usize, usize);

/// What a YAML error means, and where.
pub fn explain(text: &str, error: &serde_yaml::Error) -> (Place, String, String) {
    let message = error.to_string();
    let place = error
        .location()
        .map_or((1, 1), |at| (at.line(), at.column()));
    let context = context_place(&message);
    let lines: Vec<&str> = text.lines().collect();
    let told = quotes(&message, &lines, place, context)
        .or_else(|| signs(&message, &lines, place, context))
        .or_else(|| colons(&message, &lines, place, context))
        .or_else(|| brackets(&message, &lines, place, context))
        .or_else(|| layout(&message, text, place));
    told.unwrap_or_else(|| {
        let what = message.split(" at line ").next().unwrap_or(&message);
        (
            place,
            format!("YAML cannot read this: {what}"),
            String::from(
                "look at this line and the one above it: quotes, colons, brackets and indentation",
            ),
        )
    })
}

type Told = Option<(Place, String, String)>;

fn told(place: Place, wrong: impl Into<String>, right: impl Into<String>) -> Told {
    Some((place, wrong.into(), right.into()))
}

/// The second place in a message: `..., while scanning a quoted scalar at line 2 column 5`.
fn context_place(message: &str) -> Option<Place> {
    let (_, context) = message.split_once("while ")?;
    let (_, numbers) = context.rsplit_once("at line ")?;
    let (line, column) = numbers.split_once(" column ")?;
    Some((line.parse().ok()?, column.parse().ok()?))
}

/// The text from a place to the end of its line.
fn rest_of<'t>(lines: &[&'t str], (line, column): Place) -> &'t str {
    let text: &'t str = lines.get(line.wrapping_sub(1)).copied().unwrap_or("");
    let start = text
        .char_indices()
        .nth(column.saturating_sub(1))
        .map_or(text.len(), |(at, _)| at);
    &text[start..]
}

/// The text of a line up to a place.
fn start_of<'t>(lines: &[&'t str], place: Place) -> &'t str {
    let text: &'t str = lines.get(place.0.wrapping_sub(1)).copied().unwrap_or("");
    &text[..text.len() - rest_of(lines, place).len()]
}

/// The value that begins at a place, as far as it was meant to go.
fn value_at(rest: &str, flow: bool) -> &str {
    let rest = rest.split(" #").next().unwrap_or(rest);
    let end = if flow {
        rest.find([',', ']', '}']).unwrap_or(rest.len())
    } else {
        rest.len()
    };
    rest[..end].trim()
}

fn quotes(message: &str, lines: &[&str], place: Place, context: Option<Place>) -> Told {
    if message.contains("quoted scalar") && message.contains("end of stream") {
        let mark = rest_of(lines, context?).chars().next()?;
        return told(
            context?,
            format!("the quote {mark} opened here is never closed"),
            format!("write another {mark} where the text ends"),
        );
    }
    if message.contains("escape") {
        return told(
            place,
            "in \"...\" a backslash has a meaning of its own",
            "use single quotes: '...'",
        );
    }
    // A quote that was closed by the opening one of a later text.
    let open = context.unwrap_or(place).0;
    for line in open..=place.0 {
        let text = lines.get(line - 1)?;
        let marks: Vec<usize> = text.match_indices('"').map(|(at, _)| at).collect();
        if marks.len() % 2 == 1 && place.0 > line {
            let column = text[..*marks.last()?].chars().count() + 1;
            return told(
                (line, column),
                "the quote \" opened here is not closed on its line",
                "write another \" where the text ends",
            );
        }
    }
    let before = start_of(lines, place).trim_end();
    let closed = before
        .chars()
        .next_back()
        .filter(|c| *c == '"' || *c == '\'');
    if let Some(mark) = closed
        && message.contains("did not find expected")
    {
        let other = if mark == '"' { '\'' } else { '"' };
        return told(
            place,
            format!("the text goes on after its closing {mark}"),
            format!(
                "put the whole text in quotes, and if it has a {mark} in it, use {other}...{other}"
            ),
        );
    }
    None
}

fn signs(message: &str, lines: &[&str], place: Place, context: Option<Place>) -> Told {
    if message.contains("alias") || message.contains("unknown anchor") {
        let place = context.unwrap_or(place);
        let flow = start_of(lines, place).contains(['[', '{']);
        let value = value_at(rest_of(lines, place), flow);
        return told(
            place,
            format!("a text that begins with * needs quotes: {value}"),
            format!("write \"{value}\""),
        );
    }
    if message.contains("tab character") || rest_of(lines, place).starts_with('\t') {
        return told(
            place,
            "a tab stands here",
            "indent with spaces, two for each level",
        );
    }
    if message.contains("cannot start any token") {
        let sign = rest_of(lines, place).chars().next()?;
        return told(
            place,
            format!("a text cannot begin with {sign}"),
            "put it in quotes",
        );
    }
    if message.contains("invalid type: enum") {
        let value = value_at(rest_of(lines, place), false);
        return told(
            place,
            format!("a text that begins with ! needs quotes: {value}"),
            format!("write \"{value}\""),
        );
    }
    None
}

fn colons(message: &str, lines: &[&str], place: Place, context: Option<Place>) -> Told {
    let flow_colon =
        message.contains("did not find expected ','") && rest_of(lines, place).starts_with(':');
    if message.contains("mapping values are not allowed") || flow_colon {
        let before = start_of(lines, place);
        if let Some((_, value)) = before.rsplit_once(": ") {
            let start = before.chars().count() - value.chars().count() + 1;
            let whole = value_at(rest_of(lines, (place.0, start)), flow_colon);
            return told(
                (place.0, start),
                format!("a colon inside a text needs quotes: {whole}"),
                format!("write \"{}\"", whole.replace('"', "'")),
            );
        }
        if let Some(open) = open_bracket(lines, place.0) {
            return unclosed(lines, open, place.0);
        }
        let above = lines
            .get(place.0.wrapping_sub(2))
            .map_or("", |line| line.trim());
        if let Some((key, value)) = above.split_once(':')
            && !above.contains(": ")
            && !value.is_empty()
        {
            let line = place.0 - 1;
            let indent = lines[line - 1].chars().take_while(|c| *c == ' ').count();
            return told(
                (line, indent + 1),
                format!("`{above}` has no space after its colon, so it is one word"),
                format!("write `{key}: {value}`"),
            );
        }
        return told(
            (
                place.0,
                before.chars().take_while(|c| *c == ' ').count() + 1,
            ),
            format!("`{}:` does not fit under `{above}`", before.trim()),
            "keys of one map begin in the same column, and each has a colon and a space behind it",
        );
    }
    if message.contains("could not find expected ':'") {
        let place = context.unwrap_or(place);
        return told(
            place,
            format!(
                "`{}` has no colon behind it",
                value_at(rest_of(lines, place), false)
            ),
            "write a key, a colon, a space and the value, as in `tuning: vallotti`",
        );
    }
    None
}

fn brackets(message: &str, lines: &[&str], place: Place, context: Option<Place>) -> Told {
    let next = rest_of(lines, place).chars().next();
    if message.contains("did not find expected ','") {
        return unclosed(lines, context.unwrap_or(place), place.0);
    }
    if let Some(mark @ (']' | '}')) = next {
        return told(
            place,
            format!("this {mark} closes nothing"),
            "take it away, or open its bracket before",
        );
    }
    None
}

fn unclosed(lines: &[&str], open: Place, before: usize) -> Told {
    let (mark, close) = match rest_of(lines, open).starts_with('[') {
        true => ('[', ']'),
        false => ('{', '}'),
    };
    told(
        open,
        format!("the {mark} opened here is not closed before line {before}"),
        format!("write {close} where it ends, and a comma between its entries"),
    )
}

/// The last bracket that is still open where a line begins, quotes left aside.
fn open_bracket(lines: &[&str], line: usize) -> Option<Place> {
    let mut open = Vec::new();
    for (index, text) in lines.iter().take(line - 1).enumerate() {
        for (column, sign) in text.chars().enumerate() {
            match sign {
                '[' | '{' => open.push((index + 1, column + 1)),
                ']' | '}' => drop(open.pop()),
                _ => {}
            }
        }
    }
    open.pop()
}

fn layout(message: &str, text: &str, place: Place) -> Told {
    if message.contains("more than one document") {
        let second = text
            .lines()
            .enumerate()
            .skip(1)
            .find(|(_, line)| line.starts_with("---"));
        return told(
            (second.map_or(1, |(index, _)| index + 1), 1),
            "a second document begins here",
            "one file holds one stage: take the line `---` away",
        );
    }
    if message.contains("did not find expected key") || message.contains("'-' indicator") {
        return told(
            place,
            "this line is indented unlike its neighbours",
            "keys of one map, and dashes of one list, begin in the same column",
        );
    }
    if message.contains("block sequence entries") {
        return told(
            place,
            "a list with dashes cannot begin behind a key",
            "begin it on the next line, or write [one, two]",
        );
    }
    if message.contains("recursion limit") || message.contains("repetition limit") {
        return told(
            place,
            "this is nested too deep",
            "a stage file needs few levels",
        );
    }
    if let Some((_, position)) =
        message.split_once("control characters are not allowed at position ")
    {
        let position = position
            .trim()
            .parse::<usize>()
            .unwrap_or(0)
            .min(text.len());
        let before: String = String::from_utf8_lossy(&text.as_bytes()[..position]).into_owned();
        let line = before.matches('\n').count() + 1;
        let column = before
            .rsplit('\n')
            .next()
            .map_or(0, |last| last.chars().count())
            + 1;
        return told(
            (line, column),
            "a control character stands here",
            "take it away: a stage file is plain text",
        );
    }
    None
}
