//! The command line. The only place that opens files, prints, and ends the program.

pub mod check;
pub mod compare;
mod input;
mod interrupt;
pub mod limits;
mod options;
mod output;
mod pictures;
mod progress;
mod question;
pub mod rank;
pub mod remedy;

use std::process::ExitCode;

use clap::{Parser, Subcommand};

/// Estimates what a board's ringing nets radiate, and lays it against limit lines.
///
/// Every figure is a pre-compliance estimate, not a compliance test: the product must be tested by an accredited
/// laboratory.
#[derive(Debug, Parser)]
#[command(name = "ringfield", version, max_term_width = 100)]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// What the program can do.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Tell which nets of a board will likely fail
    Check(check::Options),
    /// Rank the nets of a whole board, and add up what they make together
    Rank(rank::Options),
    /// Hold a net against itself under other terminations, edges or layouts
    Compare(compare::Options),
    /// Find what to solder in, for every net that does not likely pass
    Remedy(remedy::Options),
    /// Tell what limit lines say
    Limits(limits::Options),
}

/// How a command ended that gave its answer. The numbers are the program's exit codes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ending {
    /// No net likely fails.
    NoneLikelyFails = 0,
    /// At least one net likely fails.
    SomeLikelyFail = 1,
    /// Some nets could not be worked out.
    Incomplete = 2,
}

/// Why a command gave no answer, as the messages to show. Nothing has been written then.
#[derive(Debug)]
pub struct Refusal(Vec<String>);

impl Refusal {
    /// A refusal in one sentence.
    fn new(sentence: impl std::fmt::Display) -> Self {
        Self(vec![format!("error: {sentence}")])
    }
}

/// Shows what is left to say; gives the exit code.
pub fn finish(outcome: Result<Ending, Refusal>) -> ExitCode {
    match outcome {
        Ok(ending) => ExitCode::from(ending as u8),
        Err(Refusal(messages)) => {
            for message in messages {
                output::tell(&message);
            }
            ExitCode::from(2)
        }
    }
}
