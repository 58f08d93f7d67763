//! Owns the command line: input, output and exit codes. Nothing below it prints.

mod asked;
mod audit;
mod find;
mod input;
mod output;
mod progress;
mod swap;
mod vet;
mod wave;
mod why;

use std::ffi::OsString;
use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use crate::fault::Fault;
use output::Answer;

/// From rail requirements to a proven bill of materials for a mains-fed linear supply.
#[derive(Parser, Debug)]
#[command(
    name = "binrail",
    version,
    arg_required_else_help = true,
    after_help = "Examples:
  binrail pick supply.toml                      choose the cheapest build and prove it
  binrail pick supply.toml --by heat --save a.json
  binrail rank supply.toml --top 10             the ten best builds
  binrail rank supply.toml --each pass          second sources: a build around every one
  binrail swap a.json --without Z1-0412         redo a saved build when parts are gone
  binrail front supply.toml                     what each watt less costs
  binrail why supply.toml Z1-0412               what keeps a part out, or what it would cost
  binrail audit a.json                          every limit of a saved or hand-written build
  binrail vet stock/                            check a catalogue
  binrail wave --source-v 12 --hz 50 --winding-ohm 0.5 --path bridge --threshold-v 0.7 --slope-ohm 0.02 \\
      --farad 4700e-6 --esr-ohm 0.03 --amps 1

Exit codes: 0 done; 1 the answer is no; 2 the input or the call is wrong; 3 stopped before the proof;
4 search and audit disagree (a bug).

Mains voltage kills. Local codes and a licensed person have the last word."
)]
struct Cli {
    #[command(subcommand)]
    command: Command,
    #[command(flatten)]
    common: Common,
}

/// What every command takes.
#[derive(Args, Debug)]
struct Common {
    /// Form of the result
    #[arg(long, value_enum, default_value_t = Format::Table, global = true)]
    format: Format,
    /// Write the result to a file instead of standard output (a regular file is replaced whole)
    #[arg(short, long, value_name = "FILE", global = true)]
    output: Option<PathBuf>,
    /// Say what work was done, on standard error
    #[arg(short, long, global = true)]
    verbose: bool,
    /// Say nothing but the result and errors
    #[arg(short, long, global = true, conflicts_with = "verbose")]
    quiet: bool,
    /// Colour
    #[arg(long, value_enum, default_value_t = Colour::Auto, global = true)]
    color: Colour,
    /// Columns to set tables in (default: the terminal's; piped tables are not wrapped)
    #[arg(long, value_name = "COLUMNS", value_parser = clap::value_parser!(u16).range(20..), global = true)]
    width: Option<u16>,
}

#[derive(ValueEnum, Debug, Clone, Copy, PartialEq, Eq)]
enum Format {
    Table,
    Json,
    Csv,
}

#[derive(ValueEnum, Debug, Clone, Copy, PartialEq, Eq)]
enum Colour {
    Auto,
    Always,
    Never,
}

#[derive(Subcommand, Debug)]
enum Command {
    /// Choose the build and prove it
    #[command(after_help = "Examples:
  binrail pick supply.toml
  binrail pick supply.toml --by heat --without Z1-0412 --with Z4-0210@logic
  binrail pick supply.toml --format csv -o bill.csv --save build.json")]
    Pick(find::Pick),
    /// The best N builds, exact, best first
    #[command(after_help = "Examples:
  binrail rank supply.toml --top 20
  binrail rank supply.toml --by heat --format json
  binrail rank supply.toml --each transformer   what each transformer would cost, with the best build around it")]
    Rank(find::Rank),
    /// Redo a saved build when parts are gone: the fewest changes, then the best
    #[command(after_help = "Examples:
  binrail swap build.json                       what is gone, withdrawn or short must go
  binrail swap build.json --without Z1-0412 --save new.json
  binrail swap build.json --without Z1-0412 --free
  binrail swap build.json --each                what the loss of each part would cost")]
    Swap(swap::Swap),
    /// The whole trade-off between cost and heat, the cheapest first (the same with either --by)
    #[command(after_help = "Example:
  binrail front supply.toml --format csv -o curve.csv")]
    Front(find::Front),
    /// What keeps a part out, or what forcing it in would cost
    #[command(after_help = "Examples:
  binrail why supply.toml Z1-0412
  binrail why supply.toml Z4-0210 --by heat --format json")]
    Why(why::Why),
    /// Every limit of a saved or hand-written build
    #[command(after_help = "Examples:
  binrail audit build.json
  binrail audit build.json --catalogue stock/   judge it by today's rows")]
    Audit(audit::Audit),
    /// The raw section from numbers on the command line
    #[command(after_help = "Example:
  binrail wave --source-v 12 --hz 50 --winding-ohm 0.5 --path bridge --threshold-v 0.7 --slope-ohm 0.02 \\
      --farad 4700e-6 --esr-ohm 0.03 --amps 1")]
    Wave(wave::Wave),
    /// Check a catalogue
    #[command(after_help = "Example:
  binrail vet stock/ --format json")]
    Vet(vet::Vet),
    /// Print the JSON Schema of the documents
    Schema,
}

/// Why there is no answer.
enum Failure {
    /// The input or the call is wrong: exit 2.
    Input(Vec<Fault>),
    /// Search and audit disagree: exit 4.
    Bug(crate::optimise::Disagreement),
}

impl From<Vec<Fault>> for Failure {
    fn from(faults: Vec<Fault>) -> Failure {
        Failure::Input(faults)
    }
}

/// A fault of the call itself.
fn call_fault(flag: &str, text: &str, problem: &str, allowed: &str) -> Fault {
    Fault {
        column: Some(flag.to_owned()),
        text: text.to_owned(),
        problem: problem.to_owned(),
        allowed: allowed.to_owned(),
        ..Fault::default()
    }
}

/// Runs the program; returns its exit code.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> u8 {
    let cli = match Cli::try_parse_from(arguments) {
        Ok(cli) => cli,
        Err(error) => {
            // Help and version are answers; everything else is a wrong call.
            let code = if error.use_stderr() { 2 } else { 0 };
            let _ = error.print();
            return code;
        }
    };
    let common = &cli.common;
    let answer: Result<Answer, Failure> = match &cli.command {
        Command::Pick(pick) => pick.run(common),
        Command::Rank(rank) => rank.run(common),
        Command::Swap(swap) => swap.run(common),
        Command::Front(front) => front.run(common),
        Command::Why(why) => why.run(common),
        Command::Audit(audit) => audit.run(common),
        Command::Wave(wave) => wave.run(common),
        Command::Vet(vet) => vet.run(common),
        Command::Schema => Ok(Answer::new(crate::report::schema::DOCUMENTS.to_owned(), 0)),
    };
    output::finish(answer, common)
}
