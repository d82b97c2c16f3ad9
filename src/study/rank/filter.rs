//! Which nets to list.

use super::{Verdict, layers};
use crate::board::Net;

/// Which nets to list; what is empty keeps all.
#[derive(Debug, Clone, Default)]
pub struct Filter {
    /// Names, in which `*` stands for any text and `?` for any character.
    pub names: Vec<String>,
    /// Clocks.
    pub clocks_hz: Vec<f64>,
    /// Names of clock sources.
    pub clock_sources: Vec<String>,
    /// Names of layers, one of which a net has to run on.
    pub layers: Vec<String>,
    /// Verdicts.
    pub verdicts: Vec<Verdict>,
}

impl Filter {
    /// Whether a net is to be listed.
    pub fn keeps(&self, net: &Net, verdict: Verdict) -> bool {
        /// A clock written with a few digits is meant for one with more.
        const SAME_CLOCK: f64 = 1e-6;
        let any = |is_empty: bool, found: bool| is_empty || found;
        let source = net.group.clock_source.as_deref();
        any(self.verdicts.is_empty(), self.verdicts.contains(&verdict))
            && any(
                self.names.is_empty(),
                self.names.iter().any(|name| matches(name, &net.name)),
            )
            && any(
                self.clocks_hz.is_empty(),
                self.clocks_hz
                    .iter()
                    .any(|clock_hz| (clock_hz / net.clock_hz - 1.0).abs() < SAME_CLOCK),
            )
            && any(
                self.clock_sources.is_empty(),
                source.is_some_and(|source| self.clock_sources.iter().any(|s| s == source)),
            )
            && any(
                self.layers.is_empty(),
                layers(net).iter().any(|layer| self.layers.contains(layer)),
            )
    }
}

/// Whether a pattern stands for a text. The last `*` seen is tried with ever more of the text.
fn matches(pattern: &str, text: &str) -> bool {
    let pattern: Vec<char> = pattern.chars().collect();
    let text: Vec<char> = text.chars().collect();
    let (mut p, mut t) = (0, 0);
    let mut last_star = None;
    while t < text.len() {
        match pattern.get(p) {
            Some('*') => {
                last_star = Some((p, t));
                p += 1;
            }
            Some(&c) if c == '?' || c == text[t] => {
                p += 1;
                t += 1;
            }
            _ => match last_star {
                Some((star, from)) => {
                    last_star = Some((star, from + 1));
                    p = star + 1;
                    t = from + 1;
                }
                None => return false,
            },
        }
    }
    pattern[p..].iter().all(|c| *c == '*')
}

#[cfg(test)]
mod tests {
    use super::matches;

    #[test]
    fn stars_and_question_marks() {
        for (pattern, text, is_match) in [
            ("CAM_*", "CAM_PCLK", true),
            ("CAM_*", "XCAM_PCLK", false),
            ("*_D?", "CAM_D7", true),
            ("*_D?", "CAM_D17", false),
            ("*A*B*", "xAyAzBw", true),
            ("CLK", "CLK2", false),
            ("**", "", true),
            ("", "", true),
            ("?", "µ", true),
        ] {
            assert_eq!(matches(pattern, text), is_match, "{pattern} {text}");
        }
    }
}
