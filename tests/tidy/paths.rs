//! Every path and macro that a source text names, without its comments and strings. A few lines instead of a parser:
//! enough for the house rules, and tried on bad snippets below.

/// A path such as `crate::pitch::Pitch`, use trees spread out.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Named {
    pub line: usize,
    pub path: Vec<String>,
    /// Stands in a `use`, where a single name may be a crate.
    pub imported: bool,
}

impl Named {
    pub fn text(&self) -> String {
        self.path.join("::")
    }
}

#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Token {
    Word(String),
    /// `::`
    Colons,
    Sign(char),
}

/// Words and signs with their line, from 1.
pub fn tokens(source: &str) -> Vec<(usize, Token)> {
    let chars: Vec<char> = source.chars().collect();
    let mut out = Vec::new();
    let (mut at, mut line) = (0, 1);
    while at < chars.len() {
        let next = after(&chars, at);
        let text: String = chars[at..next].iter().collect();
        match chars[at] {
            c if c.is_alphanumeric() || c == '_' => {
                if !is_literal(&text) {
                    out.push((line, Token::Word(text.trim_start_matches("r#").to_owned())));
                }
            }
            ':' if text == "::" => out.push((line, Token::Colons)),
            '/' | '"' | '\'' if next > at + 1 => {}
            c if c.is_whitespace() => {}
            c => out.push((line, Token::Sign(c))),
        }
        line += chars[at..next].iter().filter(|c| **c == '\n').count();
        at = next;
    }
    out
}

fn is_literal(word: &str) -> bool {
    word.contains('"')
}

/// Where the token that starts at `at` ends.
fn after(chars: &[char], at: usize) -> usize {
    let word = |c: &char| c.is_alphanumeric() || *c == '_';
    let find = |from: usize, what: &[char]| {
        (from..chars.len())
            .find(|&i| chars[i..].starts_with(what))
            .map_or(chars.len(), |i| i + what.len())
    };
    match chars[at] {
        '/' if chars[at..].starts_with(&['/', '/']) => find(at, &['\n']) - 1,
        '/' if chars[at..].starts_with(&['/', '*']) => find(at + 2, &['*', '/']),
        '"' => end_of_string(chars, at),
        '\'' if chars.get(at + 1) == Some(&'\\') => find(at + 3, &['\'']),
        '\'' if chars.get(at + 2) == Some(&'\'') => at + 3,
        ':' if chars.get(at + 1) == Some(&':') => at + 2,
        c if word(&c) => {
            let end = (at..chars.len())
                .find(|&i| !word(&chars[i]))
                .unwrap_or(chars.len());
            let prefix: String = chars[at..end].iter().collect();
            let hashes = chars[end..].iter().take_while(|c| **c == '#').count();
            match (prefix.as_str(), chars.get(end + hashes)) {
                ("r" | "br", Some('"')) => {
                    let mut close = vec!['"'];
                    close.resize(hashes + 1, '#');
                    find(end + hashes + 1, &close)
                }
                ("b" | "c", Some('"')) if hashes == 0 => end_of_string(chars, end),
                ("r", Some(c)) if hashes == 1 && word(c) => after(chars, end + 1),
                _ => end,
            }
        }
        _ => at + 1,
    }
}

fn end_of_string(chars: &[char], at: usize) -> usize {
    let mut i = at + 1;
    while i < chars.len() && chars[i] != '"' {
        i += if chars[i] == '\\' { 2 } else { 1 };
    }
    (i + 1).min(chars.len())
}

/// All paths, in order.
pub fn named(source: &str) -> Vec<Named> {
    let tokens = tokens(source);
    let mut out = Vec::new();
    let mut at = 0;
    let mut imported = false;
    while at < tokens.len() {
        match &tokens[at].1 {
            Token::Word(word) if word == "use" => imported = true,
            Token::Sign(';') => imported = false,
            Token::Word(_) | Token::Colons => {
                at = spread(&tokens, at, &[], imported, &mut out);
                continue;
            }
            Token::Sign(_) => {}
        }
        at += 1;
    }
    out
}

/// Reads one path (and the tree in braces behind it) and says where it ends.
fn spread(
    tokens: &[(usize, Token)],
    mut at: usize,
    stem: &[String],
    imported: bool,
    out: &mut Vec<Named>,
) -> usize {
    let line = tokens[at].0;
    let mut path = stem.to_vec();
    let mut open = true; // the next word belongs to this path
    while at < tokens.len() {
        match &tokens[at].1 {
            Token::Word(word) if open => {
                path.push(word.clone());
                open = false;
            }
            Token::Colons => open = true,
            Token::Sign('*') if open && !path.is_empty() => {
                path.push("*".to_owned());
                open = false;
            }
            Token::Sign('{') if open && !path.is_empty() => {
                at += 1;
                while at < tokens.len() && tokens[at].1 != Token::Sign('}') {
                    at = match tokens[at].1 {
                        Token::Sign(_) => at + 1,
                        _ => spread(tokens, at, &path, imported, out),
                    };
                }
                return at + 1;
            }
            _ => break,
        }
        at += 1;
    }
    out.push(Named {
        line,
        path,
        imported,
    });
    at
}

/// First and last line of every function with a body, and its name.
pub fn functions(source: &str) -> Vec<(String, usize, usize)> {
    let tokens = tokens(source);
    let mut out = Vec::new();
    for (at, (line, token)) in tokens.iter().enumerate() {
        if *token != Token::Word("fn".to_owned()) {
            continue;
        }
        let Some((_, Token::Word(name))) = tokens.get(at + 1) else {
            continue;
        };
        let (mut round, mut curly) = (0i32, 0i32);
        for (end, token) in &tokens[at..] {
            match token {
                Token::Sign('(' | '[') => round += 1,
                Token::Sign(')' | ']') => round -= 1,
                Token::Sign(';') if round == 0 && curly == 0 => break,
                Token::Sign('{') => curly += 1,
                Token::Sign('}') => curly -= 1,
                _ => continue,
            }
            if curly == 0 && *token == Token::Sign('}') {
                out.push((name.clone(), *line, *end));
                break;
            }
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn paths(source: &str) -> Vec<String> {
        named(source).iter().map(Named::text).collect()
    }

    #[test]
    fn use_trees_are_spread_out() {
        let found =
            paths("use crate::{engine::{Plan, plan::Part as P}, ports, pitch::*};\nuse std::fs;");
        for wanted in [
            "crate::engine::Plan",
            "crate::engine::plan::Part",
            "crate::ports",
            "crate::pitch::*",
            "std::fs",
        ] {
            assert!(found.contains(&wanted.to_owned()), "{wanted} in {found:?}");
        }
    }

    #[test]
    fn paths_in_code_are_found_and_comments_and_strings_are_not() {
        let found = paths(
            "// std::net\n/* std::env */ fn f<'a>(c: char) -> &'a str { let q = '\"'; let _ = '\\''; \
             ::hound::x(); r#\"std::io\"#; \"a \\\" std::thread\"; b\"std::sync\"; let t: Vec<std::time::Instant>; }",
        );
        let text = found.join(" ");
        assert!(
            text.contains("hound::x") && text.contains("std::time::Instant"),
            "{text}"
        );
        for hidden in ["net", "env", "io", "thread", "sync"] {
            assert!(!text.contains(hidden), "{hidden} in {text}");
        }
    }

    #[test]
    fn lines_are_counted_through_strings_and_comments() {
        let found = named("/* a\nb */\n\"x\ny\";\n// z\nstd::fs::read();");
        assert_eq!(
            (found[0].line, found[0].text()),
            (6, "std::fs::read".to_owned())
        );
    }

    #[test]
    fn functions_have_a_first_and_a_last_line() {
        let source =
            "trait T { fn none(&self); }\nfn two(a: [u8; 3]) {\n if x { y() }\n}\nfn one() {}";
        assert_eq!(
            functions(source),
            [("two".to_owned(), 2, 4), ("one".to_owned(), 5, 5)]
        );
    }
}
