//! What is wrong with an input, where, what was expected instead, and what was perhaps meant.

use std::fmt;

/// How bad it is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Severity {
    /// The thing cannot be used.
    Error,
    /// It can be used, but is perhaps not what was meant.
    Warning,
}

/// A place in a file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// Name of the file.
    pub file: String,
    /// Where in it; `None` where it is the file as a whole, or was too costly to find.
    pub position: Option<Position>,
}

/// A position in a text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Position {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.position {
            Some(Position { line, column }) => write!(f, "{}:{line}:{column}", self.file),
            None => f.write_str(&self.file),
        }
    }
}

/// A line of a file to be shown with a caret under one character. Long lines are cut to the part around it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SourceLine {
    /// The line, or the part of it that is shown.
    pub text: String,
    /// Characters of `text` before the caret.
    pub caret: usize,
}

/// Characters shown of a long line before and after the caret.
const SHOWN_BEFORE: usize = 70;
const SHOWN_AFTER: usize = 40;

impl SourceLine {
    /// Takes the line of `position` out of `text`; `None` where there is nothing on it.
    pub fn of(text: &str, position: Position) -> Option<Self> {
        let line = text
            .split('\n')
            .nth(position.line.checked_sub(1)?)?
            .trim_end();
        let column = position.column.checked_sub(1)?;
        let length = line.chars().count();
        if length == 0 {
            return None;
        }
        let (start, end) = if length <= SHOWN_BEFORE + SHOWN_AFTER {
            (0, length)
        } else {
            let start = column.saturating_sub(SHOWN_BEFORE);
            (start, length.min(column + SHOWN_AFTER))
        };
        let shown = line.chars().skip(start).take(end.saturating_sub(start));
        let mut shown: String = shown
            .map(|c| if c.is_control() { ' ' } else { c })
            .collect();
        let mut caret = column - start;
        if end < length {
            shown.push_str("...");
        }
        if start > 0 {
            shown.insert_str(0, "...");
            caret += 3;
        }
        Some(Self { text: shown, caret })
    }
}

/// One thing that is wrong with an input.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Diagnostic {
    /// How bad it is.
    pub severity: Severity,
    /// What is wrong.
    pub message: String,
    /// Where; `None` where it stands in no file.
    pub place: Option<Place>,
    /// The line it stands on.
    pub source_line: Option<SourceLine>,
    /// What was expected, to be read after "expected".
    pub expected: Option<String>,
    /// What was perhaps meant, to be read after "did you mean".
    pub near_miss: Option<String>,
}

impl Diagnostic {
    /// An error without a place.
    pub fn error(message: impl Into<String>) -> Self {
        Self {
            severity: Severity::Error,
            message: message.into(),
            place: None,
            source_line: None,
            expected: None,
            near_miss: None,
        }
    }

    /// An error about a file as a whole.
    pub fn about_file(file: &str, message: impl Into<String>) -> Self {
        let place = Place {
            file: file.to_owned(),
            position: None,
        };
        Self {
            place: Some(place),
            ..Self::error(message)
        }
    }

    /// The same, saying what was expected.
    #[must_use]
    pub fn expected(mut self, expected: impl Into<String>) -> Self {
        self.expected = Some(expected.into());
        self
    }

    /// The same, saying what was perhaps meant.
    #[must_use]
    pub fn near_miss(mut self, near_miss: Option<String>) -> Self {
        self.near_miss = near_miss;
        self
    }

    /// The whole in plain text, without a newline at the end.
    pub fn render(&self) -> String {
        let mut out = String::new();
        if let Some(place) = &self.place {
            out += &format!("{place}: ");
        }
        out += match self.severity {
            Severity::Error => "error: ",
            Severity::Warning => "warning: ",
        };
        out += &self.message;
        let position = self.place.as_ref().and_then(|place| place.position);
        if let (Some(source), Some(position)) = (&self.source_line, position) {
            let number = position.line.to_string();
            out += &format!("\n  {number} | {}", source.text);
            out += &format!("\n  {:1$} | {2:3$}^", "", number.len(), "", source.caret);
        }
        if let Some(expected) = &self.expected {
            out += &format!("\n  expected {expected}");
        }
        if let Some(near_miss) = &self.near_miss {
            out += &format!("\n  did you mean `{near_miss}`?");
        }
        out
    }
}

impl fmt::Display for Diagnostic {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.render())
    }
}

/// The candidate that `word` is a likely slip of, if there is one: at most three letters, and about a third of the word,
/// away. Case counts least.
pub fn near_miss<'c>(word: &str, candidates: impl IntoIterator<Item = &'c str>) -> Option<String> {
    let lower = word.to_lowercase();
    let slips_allowed = 3.min((lower.chars().count() + 1) / 3);
    candidates
        .into_iter()
        // The distance of words of very different lengths costs much and is never small.
        .filter(|candidate| candidate.len().abs_diff(word.len()) <= 12)
        .map(|candidate| {
            (
                strsim::damerau_levenshtein(&lower, &candidate.to_lowercase()),
                candidate,
            )
        })
        .filter(|(slips, _)| *slips <= slips_allowed)
        .min_by_key(|(slips, _)| *slips)
        .map(|(_, candidate)| candidate.to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn renders_place_line_caret_expectation_and_near_miss() {
        let position = Position { line: 2, column: 4 };
        let diagnostic = Diagnostic {
            place: Some(Place {
                file: "board.yaml".into(),
                position: Some(position),
            }),
            source_line: SourceLine::of("a: 1\nb: 4\n", position),
            ..Diagnostic::error("width has no unit: `4`")
                .expected("a length such as `4 mil`")
                .near_miss(Some("4 mil".into()))
        };
        assert_eq!(
            diagnostic.render(),
            "board.yaml:2:4: error: width has no unit: `4`\n  2 | b: 4\n    |    ^\n  expected a length such as `4 mil`\n  did you mean `4 mil`?"
        );
    }

    #[test]
    fn long_lines_are_cut_around_the_caret() {
        let text = format!("{}x{}", "-".repeat(1000), "+".repeat(1000));
        let source = SourceLine::of(
            &text,
            Position {
                line: 1,
                column: 1001,
            },
        )
        .unwrap();
        assert_eq!(source.text.chars().nth(source.caret), Some('x'));
        assert!(source.text.len() < 130);
        assert!(source.text.starts_with("...-") && source.text.ends_with("+..."));
    }

    #[test]
    fn near_misses_are_near() {
        let words = ["microstrip", "stripline", "MHz", "via"];
        assert_eq!(
            near_miss("microstirp", words).as_deref(),
            Some("microstrip")
        );
        assert_eq!(near_miss("mhz", words).as_deref(), Some("MHz"));
        assert_eq!(near_miss("vis", words).as_deref(), Some("via"));
        assert_eq!(near_miss("ox", words), None);
        assert_eq!(near_miss("something", words), None);
    }
}
