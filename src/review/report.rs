//! What a review says.

use super::why::Why;
use crate::circuit::NetId;
use crate::engine::Trace;
use crate::findings::{Against, Asked, Fact, Kind, Reason};
use crate::flow::Flow;
use crate::instance::{Instance, Which};
use crate::logic::Bits;
use crate::proof::Proof;
use crate::search::SearchReport;
use crate::sweep::SweepReport;

/// One run, with what was found in it.
#[derive(Clone, Debug)]
pub struct RunReport {
    /// Which case it was.
    pub which: Which,
    /// The case itself.
    pub instance: Instance,
    /// Everything that happened.
    pub trace: Trace,
    /// What was found, worst first.
    pub facts: Vec<Fact>,
    /// Questions judged in it.
    pub judged: u64,
    /// Questions that could not be judged in it, by number, and why.
    pub not_judged: Vec<(u32, Reason)>,
    /// Windows that ended where the reference does not allow it, in order.
    pub against: Vec<Against>,
}

impl RunReport {
    /// How the window that a fact is about departed from the reference, if that is what the fact says.
    pub fn against(&self, fact: &Fact) -> Option<&Against> {
        let mut all = self.against.iter().filter(|_| fact.subject.kind == Kind::NotInReference);
        all.find(|it| Some(it.departure.moment) == fact.subject.moment)
    }
}

/// The delay-free view.
#[derive(Clone, Debug)]
pub struct StatesReport {
    /// Number of stable states over all input vectors, exact, in decimal; `None` if the budget ran out.
    pub count: Option<String>,
    /// Nets that cut every loop.
    pub feedback: Vec<NetId>,
    /// Fewest nets that tell the stable states of one input vector apart.
    pub state_variables: Vec<NetId>,
    /// Are they surely the fewest?
    pub state_variables_exact: bool,
    /// The nets of `rows`: inputs, then feedback nets.
    pub variables: Vec<NetId>,
    /// Disjoint ternary rows over `variables`; `None` is either value.
    pub rows: Vec<Vec<Option<bool>>>,
    /// A limit cut `rows`.
    pub rows_truncated: bool,
    /// For each input vector, in counting order, its stable states over all nets.
    pub inputs: Vec<(Vec<bool>, Vec<Bits>)>,
    /// A limit cut `inputs`.
    pub inputs_truncated: bool,
    /// Input vectors with no, one, several stable states, in decimal; `None` if the budget ran out.
    pub vectors: Option<[String; 3]>,
    /// What may follow what: flow table, coverage, automaton, hazards, reference.
    pub flow: Flow,
}

/// The verdict of a review or sweep.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Call {
    /// A rule is broken.
    Broken,
    /// Something that was asked could not be judged.
    Undecided,
    /// Proved for all delays in the ranges.
    Proved,
    /// Nothing was found in the draws that were made.
    NoFailureFound,
}

impl Call {
    /// The words of the verdict.
    pub const fn words(self) -> &'static str {
        match self {
            Call::Broken => "broken",
            Call::Undecided => "undecided",
            Call::Proved => "proved",
            Call::NoFailureFound => "no failure found",
        }
    }
}

/// The verdict, with its reasons.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Verdict {
    /// The verdict.
    pub call: Call,
    /// One sentence that names draws and stimulus.
    pub sentence: String,
    /// Why it is broken or undecided, most important first.
    pub reasons: Vec<String>,
}

/// The whole review.
#[derive(Clone, Debug)]
pub struct Review {
    /// What was asked.
    pub asked: Asked,
    /// The delay-free view.
    pub states: StatesReport,
    /// The typical run; `None` if the circuit cannot be run yet.
    pub typical: Option<RunReport>,
    /// The sweep, with what the search found and no draw showed among its findings.
    pub sweep: SweepReport,
    /// The directed search with the scenario's own delays; `None` if none was asked for.
    pub search: Option<SearchReport>,
    /// What holds for every delay in the ranges, within a small budget; `None` if none was asked for. What it refutes and
    /// nothing else met is among the findings.
    pub proof: Option<Proof>,
    /// For some findings (by index in `sweep.findings`) their failing case, run.
    pub shown: Vec<(usize, RunReport)>,
    /// For each finding of the sweep why it happens, where that was looked into.
    pub why: Vec<Option<Why>>,
    /// The verdict.
    pub verdict: Verdict,
}
