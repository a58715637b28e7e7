//! Places where ` #` silently cuts a title or a note.
//!
//! To YAML, a `#` after a space begins a comment, so `Polka #2` is read as `Polka`. Nothing is left of it in the tree:
//! the text itself must be looked at, quotes and block texts set aside.

/// A ` #` that was hardly meant as a comment.
#[derive(Debug, PartialEq, Eq)]
pub struct Cut {
    /// From 1.
    pub line: usize,
    pub column: usize,
    /// What is left of the text before it.
    pub read: String,
    /// What was meant.
    pub meant: String,
    /// A note such as `F #`, to be written without the space.
    pub note: bool,
}

/// All such places, in reading order.
pub fn cuts(text: &str) -> Vec<Cut> {
    let mut found = Vec::new();
    let mut quote: Option<char> = None;
    // Indentation of the line that began a block text (`about: |`), while inside one.
    let mut block: Option<usize> = None;
    for (index, line) in text.lines().enumerate() {
        let indent = line.len() - line.trim_start().len();
        if block.is_some_and(|outer| indent > outer || line.trim().is_empty()) {
            continue;
        }
        block = None;
        let chars: Vec<char> = line.chars().collect();
        if let Some(hash) = comment(&chars, &mut quote) {
            found.extend(judge(&chars, hash, index + 1));
        } else if quote.is_none() && begins_block(line) {
            block = Some(indent);
        }
    }
    found
}

fn begins_block(line: &str) -> bool {
    let end = line.trim_end().trim_end_matches(['-', '+']);
    [": |", ": >", "- |", "- >"]
        .iter()
        .any(|mark| end.ends_with(mark))
}

/// Where the comment of a line begins, if it has one. `quote` carries an open quote from line to line.
fn comment(chars: &[char], quote: &mut Option<char>) -> Option<usize> {
    // A quote is one only where a value can begin.
    let mut fresh = true;
    for (at, c) in chars.iter().enumerate() {
        let after_space = at == 0 || chars[at - 1].is_whitespace();
        match (*quote, c) {
            (Some(open), c) if open == *c => {
                let escaped = open == '"' && at > 0 && chars[at - 1] == '\\';
                if !escaped {
                    *quote = None;
                }
                fresh = false;
            }
            (Some(_), _) => {}
            (None, '#') if after_space => return Some(at),
            (None, '"' | '\'') if fresh => *quote = Some(*c),
            (None, '[' | '{' | ',') => fresh = true,
            (None, ':' | '-') if chars.get(at + 1).is_none_or(|c| c.is_whitespace()) => {
                fresh = true
            }
            (None, c) if c.is_whitespace() => {}
            (None, _) => fresh = false,
        }
    }
    None
}

/// Whether the comment at `hash` looks like the rest of a title or a note.
fn judge(chars: &[char], hash: usize, line: usize) -> Option<Cut> {
    let before: String = chars[..hash].iter().collect();
    let after: String = chars[hash + 1..].iter().collect();
    let value = before
        .rsplit(['[', '{', ','])
        .next()
        .map(|item| item.rsplit_once(": ").map_or(item, |(_, value)| value))
        .map(|item| item.trim().trim_start_matches("- ").trim())?;
    let next = after.chars().next();
    let letter = matches!(value.as_bytes(), [b'A'..=b'G']);
    let goes_on = next.is_none_or(|c| ":,]}".contains(c) || c.is_ascii_digit());
    let worded = value.chars().next_back().is_some_and(char::is_alphanumeric)
        && value.chars().any(char::is_alphabetic);
    let numbered = next.is_some_and(|c| c.is_ascii_digit());
    if !(letter && goes_on || worded && numbered) {
        return None;
    }
    let rest: String = after.chars().take_while(|c| !",]}:".contains(*c)).collect();
    let gap = if letter { "" } else { " " };
    Some(Cut {
        line,
        column: hash + 1,
        read: value.to_string(),
        meant: format!("{value}{gap}#{}", rest.trim_end()),
        note: letter,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn meant(text: &str) -> Vec<(usize, usize, String)> {
        cuts(text)
            .into_iter()
            .map(|cut| (cut.line, cut.column, cut.meant))
            .collect()
    }

    #[test]
    fn titles_and_notes_are_seen() {
        for (text, line, column, wanted) in [
            ("set: [Polka #2, Waltz]", 1, 13, "Polka #2"),
            ("set:\n  - Polka #2\n", 2, 11, "Polka #2"),
            ("a:\n  song: Polka #2  \n", 2, 15, "Polka #2"),
            ("keys: {C: 0, F #: 2}", 1, 16, "F#"),
            ("tonic: F #", 1, 10, "F#"),
            ("pitch: F #4", 1, 10, "F#4"),
        ] {
            assert_eq!(meant(text), [(line, column, wanted.to_string())], "{text}");
        }
    }

    #[test]
    fn comments_are_left_alone() {
        for text in [
            "set: [Polka] #2 of them",
            "tonic: E # as in the book",
            "channel: 3 #2 would do",
            "song: \"Polka #2\"",
            "song: 'it #2' # yes",
            "about: |\n  Polka #2\n  F #\n",
            "# 1. first\nstage: x\n",
            "tuning: vallotti #warm",
        ] {
            assert_eq!(meant(text), [], "{text}");
        }
    }
}
