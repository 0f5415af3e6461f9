//! Commands and options.

use std::path::PathBuf;

use clap::builder::PossibleValuesParser;
use clap::{Args, Parser, Subcommand};

use crate::output::json;
use crate::review::PROOF_ZONES;
use crate::scenario::Plan;
use crate::sweep::Until;

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
    Review(Reviewing),
    /// One run, with its waveforms
    Run(Running),
    /// The Monte Carlo sweep alone, whole or in parts
    Sweep(Long),
    /// Puts the parts of a sweep together
    Merge(Merging),
    /// How fast may it go: shortest spacing, pulse, period, setup or hold, longest skew for which all rules pass
    Limit(Limiting),
    /// All stable states, without delays
    States(Looking),
    /// Bounded-delay verdicts: what holds for every delay in the ranges, and delays that break the rest
    Prove(Proving),
    /// Reads the scenario, reports errors, prints what it understood
    Check(Checking),
    /// Prints a script that completes commands and options in a shell
    ///
    /// For bash, for example: `stillgate completions bash > ~/.local/share/bash-completion/completions/stillgate`
    Completions {
        /// For which shell
        shell: clap_complete::Shell,
    },
    /// Prints the manual page of the program, or of one of its commands
    ///
    /// It is made of the same definitions as --help. To read it: `stillgate manual | man -l -`
    Manual {
        /// A command, as in `stillgate manual review`; without it the page of the program
        command: Option<String>,
    },
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
pub struct Long {
    #[command(flatten)]
    pub sweeping: Sweeping,
    /// Sweep only samples A to A+N-1 of the plan and write them as a part, to be put together by `merge`
    #[arg(long, value_name = "A", requires = "count", conflicts_with_all = ["part", "until", "strict", "unfinished"])]
    pub samples_from: Option<u64>,
    /// How many samples the part has; with --samples-from. With `tries`, whole boards
    #[arg(long, value_name = "N", requires = "samples_from", value_parser = clap::value_parser!(u64).range(1..1 << 62))]
    pub count: Option<u64>,
    /// The K-th of N parts of about equal size, from 1, in place of --samples-from and --count
    #[arg(long, value_name = "K/N", value_parser = share, conflicts_with_all = ["until", "strict", "unfinished"])]
    pub part: Option<(u64, u64)>,
    /// Keep what is done after each N samples, so that nothing before is lost if the program is killed
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(1..1 << 62))]
    pub keep_every: Option<u64>,
    /// Go on with an unfinished sweep or part, from the file that it left. The scenario and its draws are in the file
    #[arg(long = "continue", id = "unfinished", value_name = "PART", conflicts_with_all = ["scenario", "samples", "seed", "draw", "until"])]
    pub unfinished: Option<PathBuf>,
    /// Stop when every 95 % interval of a share is at most this wide, from end to end, as in 1e-4; --samples is the most
    #[arg(long, value_name = "WIDTH")]
    pub until: Option<Until>,
}

/// `3/16`: the third of sixteen.
fn share(text: &str) -> Result<(u64, u64), String> {
    let numbers = text.split_once('/').and_then(|(k, n)| Some((k.parse().ok()?, n.parse().ok()?)));
    match numbers {
        Some((k, n)) if (1..=n).contains(&k) => Ok((k, n)),
        _ => Err("write K/N, as in 3/16 for the third of sixteen parts; K is 1 to N".to_string()),
    }
}

#[derive(Debug, Args)]
pub struct Merging {
    /// Files of parts, in any order
    #[arg(required = true, value_name = "PART")]
    pub parts: Vec<PathBuf>,
    /// Accept samples that no part has; the result says which
    #[arg(long)]
    pub allow_gaps: bool,
    /// Write the parts together as one part, in place of results; they need not be all of the sweep
    #[arg(long, value_name = "FILE", conflicts_with_all = ["out", "strict", "allow_gaps"])]
    pub save: Option<PathBuf>,
    #[command(flatten)]
    pub folder: Folder,
    /// Print one JSON object instead of the text
    #[arg(long)]
    pub json: bool,
    /// Print nothing but errors (and the JSON object, with --json)
    #[arg(long, short)]
    pub quiet: bool,
    /// Exit with 1 if the verdict is broken or undecided
    #[arg(long)]
    pub strict: bool,
}

#[derive(Debug, Args)]
pub struct Reviewing {
    #[command(flatten)]
    pub sweeping: Sweeping,
    /// Runs that the directed search for the worst case may take for each question no draw broke, in place of the
    /// scenario's; 0: no search. What it meets is no bound
    #[arg(long, value_name = "N", value_parser = searched)]
    pub search: Option<u64>,
    /// Zones that the proof over all delays may keep in all explorations, a tenth of them in one; 0: no proof. `prove` has
    /// larger budgets
    #[arg(long, value_name = "N", default_value_t = PROOF_ZONES, value_parser = clap::value_parser!(u64).range(..=1 << 32))]
    pub proof_zones: u64,
}

/// 0, or enough runs to be of use.
fn searched(text: &str) -> Result<u64, String> {
    let runs: u64 = text.parse().map_err(|_| "not a whole number".to_string())?;
    let least = Plan::LEAST_SEARCH;
    if (1..least).contains(&runs) {
        return Err(format!("a search takes at least {least} runs a question; 0 is none"));
    }
    Ok(runs)
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
    /// A second case, named as with --delays: draws one more picture, with it behind the first, thin and dashed
    #[arg(long, value_name = "CASE")]
    pub against: Option<String>,
    /// Under this condition of the scenario, in place of its own delays
    #[arg(long, value_name = "NAME")]
    pub condition: Option<String>,
    /// Nets to draw, in this order, separated by commas; default those of [plot], else all that fit
    #[arg(long, value_name = "A,B,...", value_delimiter = ',')]
    pub nets: Vec<String>,
    /// Exit with 1 if a rule is broken or something could not be judged in this run
    #[arg(long)]
    pub strict: bool,
}

#[derive(Debug, Args)]
pub struct Proving {
    #[command(flatten)]
    pub input: Input,
    #[command(flatten)]
    pub folder: Folder,
    /// Zones that one exploration may keep; beyond that its claims are undecided
    #[arg(long, value_name = "N", default_value_t = 100_000, value_parser = clap::value_parser!(u64).range(1..=1 << 32))]
    pub zones: u64,
    /// MiB that one exploration may take; beyond that its claims are undecided
    #[arg(long, value_name = "N", default_value_t = 1024, value_parser = clap::value_parser!(u64).range(1..=1 << 20))]
    pub memory: u64,
    /// Seconds for the whole proof; beyond that what is left is undecided, and results depend on the machine
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(1..=1 << 32))]
    pub seconds: Option<u64>,
    /// Also find how far all ranges may be stretched about typical with each claim still proved; several times the work
    #[arg(long)]
    pub margin: bool,
    /// Also find the least delay to add so that what is refuted becomes proved; several times the work
    #[arg(long)]
    pub padding: bool,
    /// Exit with 1 unless every claim is proved
    #[arg(long)]
    pub strict: bool,
}

#[derive(Debug, Args)]
pub struct Looking {
    #[command(flatten)]
    pub input: Input,
    #[command(flatten)]
    pub folder: Folder,
    /// Most values of nets that one list of states of the JSON holds; beyond that it is cut and marked
    #[arg(long, value_name = "N", default_value_t = json::MOST_VALUES)]
    pub most_values: usize,
}

#[derive(Debug, Args)]
pub struct Checking {
    #[command(flatten)]
    pub input: Input,
}
