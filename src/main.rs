//! `ringfield`: estimates what a board's ringing nets radiate, before the paid laboratory visit.

mod front;

use std::process::ExitCode;

use clap::Parser;
use front::{Arguments, Command, check, compare, limits, rank, remedy};

fn main() -> ExitCode {
    let outcome = match Arguments::parse().command {
        Command::Check(options) => check::run(&options),
        Command::Rank(options) => rank::run(&options),
        Command::Compare(options) => compare::run(&options),
        Command::Remedy(options) => remedy::run(&options),
        Command::Limits(options) => limits::run(&options),
    };
    front::finish(outcome)
}
