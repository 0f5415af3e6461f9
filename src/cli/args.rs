//! Commands and options.

use std::path::PathBuf;

use clap::builder::PossibleValuesParser;
use clap::{Args, Parser, Subcommand};

/// Shows where a block of feedback logic comes to rest, with typical delays and with many draws of them.
///
/// A scenario file holds the circuit, its delay ranges, the stimulus and the rules. Without one, the built-in
/// demonstration is used: the interlock of two canal-lock gates.
///
/// Exit codes: 0 done; 1 the verdict is broken or undecided, only with --strict; 2 the input or the command line is bad;
/// 3 the program caught itself in a contradiction, please report it; 130 interrupted.
#[derive(Debug, Parser)]
#[command(name = "stillgate", version, max_term_width = 100, subcommand_required = true, arg_required_else_help = true)]
pub struct Arguments {
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Debug, Subcommand)]
pub enum Command {
    /// The main job: stable states, typical run, sweep, findings, pictures, verdict
    Review(Sweeping),
    /// One run, with its waveforms
    Run(Running),
    /// The Monte Carlo sweep alone
    Sweep(Sweeping),
    /// How fast may it go: shortest spacing, pulse, period, setup or hold, longest skew for which all rules pass
    Limit(Limiting),
    /// All stable states, without delays
    States(Looking),
    /// Reads the scenario, reports errors, prints what it understood
    Check(Checking),
}

#[derive(Debug, Args)]
pub struct Input {
    /// The scenario file (TOML); without it the built-in demonstration
    pub scenario: Option<PathBuf>,
    /// Print one JSON object instead of the text
    #[arg(long)]
    pub json: bool,
    /// Print nothing but errors (and the JSON object, with --json)
    #[arg(long, short)]
    pub quiet: bool,
}

#[derive(Debug, Args)]
pub struct Folder {
    /// Folder for the files, made if needed; default `stillgate-out/<scenario stem>`
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub struct Draws {
    /// Number of draws, in place of the scenario's
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(1..1 << 62))]
    pub samples: Option<u64>,
    /// Seed of all draws, in place of the scenario's
    #[arg(long, value_name = "S")]
    pub seed: Option<u64>,
    /// How delays spread over their ranges, in place of the scenario's
    #[arg(long, value_name = "KIND", value_parser = PossibleValuesParser::new(["uniform", "triangular", "normal", "corners", "hypercube"]))]
    pub draw: Option<String>,
}

#[derive(Debug, Args)]
pub struct Sweeping {
    #[command(flatten)]
    pub input: Input,
    #[command(flatten)]
    pub folder: Folder,
    #[command(flatten)]
    pub draws: Draws,
    /// Number of threads; default all cores. The results do not depend on it
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub threads: Option<u16>,
    /// Exit with 1 if the verdict is broken or undecided
    #[arg(long)]
    pub strict: bool,
}

#[derive(Debug, Args)]
pub struct Limiting {
    #[command(flatten)]
    pub input: Input,
    #[command(flatten)]
    pub folder: Folder,
    #[command(flatten)]
    pub draws: Draws,
    /// What to vary: spacing STEP | spacing all | pulse NET [STEP STEP] | period CLOCK | skew STEP |
    /// lead STEP EDGE | lag STEP EDGE; steps and clock edges by their labels
    #[arg(long, value_names = ["WHAT", "NAME"], num_args = 2..=4, required = true)]
    pub of: Vec<String>,
    /// Least value to try, in the scenario's unit or with one; default chosen from the scenario
    #[arg(long, value_name = "TIME", allow_hyphen_values = true)]
    pub from: Option<String>,
    /// Greatest value to try; default chosen from the scenario
    #[arg(long, value_name = "TIME", allow_hyphen_values = true)]
    pub to: Option<String>,
    /// How close to follow a limit; default 1 fs where all draws are alike, else about a thousandth of the range
    #[arg(long, value_name = "TIME", conflicts_with = "and")]
    pub to_within: Option<String>,
    /// Values of the first scan; default 33, for a map 17 each way
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(2..=1001))]
    pub points: Option<u32>,
    /// A second thing to vary, as --of: gives a map of the pairs that pass
    #[arg(long, value_names = ["WHAT", "NAME"], num_args = 2..=4)]
    pub and: Vec<String>,
    /// Least value of the second
    #[arg(long, value_name = "TIME", requires = "and", allow_hyphen_values = true)]
    pub and_from: Option<String>,
    /// Greatest value of the second
    #[arg(long, value_name = "TIME", requires = "and", allow_hyphen_values = true)]
    pub and_to: Option<String>,
    /// Number of threads; default all cores. The results do not depend on it
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub threads: Option<u16>,
    /// Exit with 1 if the easy end of the range does not pass; of a map, if no pair passes
    #[arg(long)]
    pub strict: bool,
}

#[derive(Debug, Args)]
pub struct Running {
    #[command(flatten)]
    pub input: Input,
    #[command(flatten)]
    pub folder: Folder,
    #[command(flatten)]
    pub draws: Draws,
    /// Which case: typ, min, max, sample:N, one of these with all times moved by single femtoseconds (typ~1 to typ~8,
    /// sample:N~3), or an instance file
    #[arg(long, value_name = "CASE", default_value = "typ")]
    pub delays: String,
    /// Under this condition of the scenario, in place of its own delays
    #[arg(long, value_name = "NAME")]
    pub condition: Option<String>,
    /// Nets to draw, in this order, separated by commas; default all that fit
    #[arg(long, value_name = "A,B,...", value_delimiter = ',')]
    pub nets: Vec<String>,
    /// Exit with 1 if a rule is broken or something could not be judged in this run
    #[arg(long)]
    pub strict: bool,
}

#[derive(Debug, Args)]
pub struct Looking {
    #[command(flatten)]
    pub input: Input,
    #[command(flatten)]
    pub folder: Folder,
}

#[derive(Debug, Args)]
pub struct Checking {
    #[command(flatten)]
    pub input: Input,
}
