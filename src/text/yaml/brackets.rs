//! A look at the nesting of brackets before the parser runs.

use super::Position;

/// Deepest nesting of brackets: the parser's time grows with its square, and no board needs more.
pub(super) const DEEPEST_BRACKETS: usize = 64;

/// Where brackets are nested too deeply, if they are. Comments and quoted texts do not count.
pub(super) fn too_deep(text: &str) -> Option<Position> {
    let mut open = 0usize;
    let mut position = Position { line: 1, column: 0 };
    let mut quote = None;
    let mut in_comment = false;
    // What stands before: a quote or a comment only starts after white space or punctuation.
    let mut before = '\n';
    for c in text.chars() {
        position.column += 1;
        if c == '\n' {
            position = Position {
                line: position.line + 1,
                column: 0,
            };
            in_comment = false;
        } else if in_comment {
        } else if let Some(closing) = quote {
            if c == closing && before != '\\' {
                quote = None;
            }
        } else {
            match c {
                '#' if before.is_whitespace() => in_comment = true,
                '"' | '\'' if before.is_whitespace() || "[{,:".contains(before) => quote = Some(c),
                '[' | '{' => open += 1,
                ']' | '}' => open = open.saturating_sub(1),
                _ => {}
            }
            if open > DEEPEST_BRACKETS {
                return Some(position);
            }
        }
        before = c;
    }
    None
}
