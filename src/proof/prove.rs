//! The proof of a scenario: what it may spend, and what it says of every question.
//!
//! Each question is asked of the cone of its nets alone: nothing else has to do with it. A hull is explored first, which
//! holds all that can happen and perhaps more; what it does not find is proved. Where it finds something, the exact
//! exploration decides, and a trace of it becomes a case that is run with the judges of the sweep: only what the run shows
//! is called refuted.

use std::collections::BTreeSet;
use std::time::{Duration, Instant};

use super::claim::{Call, Claim, Proof};
use super::cycles::{RestVerdict, comes_to_rest_within};
use super::evidence::Evidence;
use super::explore::explore;
use super::explored::{Budget, Ended, Explored, Mode};
use super::plant::Plant;
use super::watch::Watch;
use crate::circuit::NetId;
use crate::control::Control;
use crate::engine::Program;
use crate::findings::Asked;
use crate::scenario::Scenario;
use crate::time::Span;

/// Gates of a cone that may begin at random, at most: every start is explored.
const RANDOM_GATES: usize = 12;

/// Of what all explorations together may keep, the share that one may: one part in so many.
const SHARE: u64 = 10;
/// Gates of a cone that cost as much as a zone.
const GATES_A_ZONE: usize = 64;

/// What a proof may spend.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Spend {
    /// Zones of one exploration, at most.
    pub zones: u64,
    /// Zones of all explorations together, at most; `None` for no bound. What begins when they are spent is undecided. A
    /// cone counts as a zone for every 64 gates.
    pub total: Option<u64>,
    /// Bytes of one exploration, at most.
    pub bytes: u64,
    /// Time for all, at most; `None` for no bound.
    pub time: Option<Duration>,
    /// Look for the margin of each claim as well: several explorations a claim.
    pub margins: bool,
    /// Look for delays to add that make what is refuted proved: the whole proof several times over.
    pub padding: bool,
}

impl Default for Spend {
    fn default() -> Spend {
        Spend { zones: 200_000, total: None, bytes: 1 << 30, time: None, margins: false, padding: false }
    }
}

impl Spend {
    /// So many zones in all, a tenth of them for one exploration, so that no question leaves the others without.
    pub fn in_all(zones: u64) -> Spend {
        Spend { zones: (zones / SHARE).max(1), total: Some(zones), ..Spend::default() }
    }
}

/// Proves or refutes what a scenario asks.
pub fn prove(scenario: &Scenario, program: &Program, asked: &Asked, spend: &Spend, control: &Control) -> Proof {
    let budget = Budget {
        zones: spend.zones,
        bytes: spend.bytes,
        until: spend.time.map(|time| Instant::now() + time),
        control: control.clone(),
    };
    let mut prover = Prover::new(scenario, program, asked, budget);
    prover.left = spend.total;
    prover.branches = Some(spend.total.map_or(u64::MAX, |zones| zones / super::varying::ZONES_A_BRANCH));
    prover.proof.allowed = spend.total;
    prover.collects = spend.margins || spend.padding;
    prover.questions(&|_| true);
    prover.windows();
    prover.proof.claims.sort_by_key(|claim| claim.question);
    if spend.margins {
        prover.margins();
    }
    if spend.padding {
        prover.padding();
    }
    prover.proof
}

pub(super) struct Prover<'a> {
    pub(super) scenario: &'a Scenario,
    pub(super) program: &'a Program,
    pub(super) asked: &'a Asked,
    pub(super) budget: Budget,
    /// Zones that all explorations together may still keep.
    left: Option<u64>,
    /// Beginnings of traces that all searches for constant delays may still keep; `None`: there are no such searches.
    pub(super) branches: Option<u64>,
    pub(super) proof: Proof,
    /// Is evidence kept?
    pub(super) collects: bool,
    /// What speaks against claims.
    pub(super) evidence: Vec<Evidence>,
}

/// Why nothing can be said, and whether that is for want of time or by nature.
pub(super) struct Unsaid {
    pub call: Call,
    pub reason: String,
}

/// A cone with the states that it begins in.
pub(super) struct World {
    pub plant: Plant,
    pub starts: Vec<Vec<bool>>,
}

impl<'a> Prover<'a> {
    pub(super) fn new(scenario: &'a Scenario, program: &'a Program, asked: &'a Asked, budget: Budget) -> Prover<'a> {
        let (proof, collects, evidence) = (Proof::default(), false, Vec::new());
        Prover { scenario, program, asked, budget, left: None, branches: None, proof, collects, evidence }
    }

    pub(super) fn world(&mut self, nets: &[NetId], spans: &[Span]) -> Result<World, Unsaid> {
        let plant = Plant::of(self.scenario, nets, spans)
            .map_err(|what| Unsaid { call: Call::NotCovered, reason: what.to_string() })?;
        self.spend((plant.gates.len() / GATES_A_ZONE) as u64);
        let starts = match self.program.start() {
            Some(start) => vec![plant.nets.iter().map(|net| start.ones.get(net.index())).collect()],
            None if plant.gates.len() > RANDOM_GATES => {
                let reason = format!(
                    "it begins at random with {} gates; every start of up to {RANDOM_GATES} is explored",
                    plant.gates.len()
                );
                return Err(Unsaid { call: Call::NotCovered, reason });
            }
            None => (0..1u64 << plant.gates.len())
                .map(|bits| {
                    let gates = (0..plant.gates.len()).map(|gate| bits >> gate & 1 == 1);
                    plant.initial.iter().copied().chain(gates).collect()
                })
                .collect(),
        };
        Ok(World { plant, starts })
    }

    /// Explores to the end.
    pub(super) fn explore<W: Watch>(&mut self, world: &World, watch: &W, mode: Mode) -> Result<Explored, Unsaid> {
        let (found, short) = self.explore_some(world, watch, mode);
        short.map_or(Ok(found), Err)
    }

    /// Explores as far as the budget goes, and says why no farther.
    pub(super) fn explore_some<W: Watch>(
        &mut self,
        world: &World,
        watch: &W,
        mode: Mode,
    ) -> (Explored, Option<Unsaid>) {
        if let Some(spent) = self.spent() {
            return (Explored::nothing(&world.plant), Some(spent));
        }
        let found = explore(&world.plant, &world.starts, watch, mode, &self.allowance());
        self.proof.zones += found.zones;
        let short = match found.ended {
            Ended::Complete | Ended::Hit => None,
            ended => Some(Unsaid { call: Call::Undecided, reason: self.why(ended) }),
        };
        self.spend(found.zones);
        (found, short)
    }

    /// Does every window of a world come to rest? If not, also after which numbers of steps there may be cycles beside those
    /// that were found.
    pub(super) fn comes_to_rest(&mut self, world: &World) -> (RestVerdict, BTreeSet<u32>) {
        if self.spent().is_some() {
            return (RestVerdict::Undecided(Ended::Zones), BTreeSet::new());
        }
        let looked = comes_to_rest_within(&world.plant, &world.starts, &self.allowance());
        self.proof.zones += looked.zones;
        self.spend(looked.zones);
        (looked.verdict, looked.open)
    }

    /// What the next exploration may keep.
    pub(super) fn allowance(&self) -> Budget {
        Budget { zones: self.left.map_or(self.budget.zones, |left| left.min(self.budget.zones)), ..self.budget.clone() }
    }

    pub(super) fn spend(&mut self, zones: u64) {
        self.left = self.left.map(|left| left.saturating_sub(zones));
    }

    /// Why nothing more is explored, where all zones are spent.
    pub(super) fn spent(&self) -> Option<Unsaid> {
        let zones = self.proof.allowed.filter(|_| self.left == Some(0))?;
        Some(Unsaid { call: Call::Undecided, reason: format!("the budget of {zones} zones in all ran out") })
    }

    pub(super) fn why(&self, ended: Ended) -> String {
        match ended {
            Ended::Complete | Ended::Hit => "nothing stopped it".to_string(),
            Ended::Zones if self.left.is_some_and(|left| left < self.budget.zones) => {
                format!("the budget of {} zones in all ran out", self.proof.allowed.unwrap_or_default())
            }
            Ended::Zones => format!("the budget of {} zones ran out", self.budget.zones),
            Ended::Bytes => format!("the budget of {} MiB ran out", self.budget.bytes >> 20),
            Ended::Seconds => "the time for the proof ran out".to_string(),
            Ended::Together => "too many gates may fire at one instant".to_string(),
            Ended::InFlight => "too many changes are under way on one wire".to_string(),
            Ended::Cancelled => "interrupted".to_string(),
        }
    }

    pub(super) fn claim(&mut self, question: u32, call: Call) -> &mut Claim {
        self.proof.claims.push(Claim::new(question, call));
        self.proof.claims.last_mut().expect("it was just added")
    }

    pub(super) fn unsaid(&mut self, questions: &[u32], unsaid: &Unsaid) {
        for question in questions {
            self.claim(*question, unsaid.call).reason = Some(unsaid.reason.clone());
        }
    }

    /// The gates of the circuit, those tied together by gates in one part.
    pub(super) fn parts(&self) -> Vec<Vec<NetId>> {
        let circuit = &*self.scenario.circuit;
        let mut parts: Vec<Vec<NetId>> = vec![Vec::new(); circuit.block_count()];
        for gate in circuit.gates() {
            parts[circuit.block(gate) as usize].push(circuit.net_of(gate));
        }
        // edges of every clock begin windows of all parts
        for part in &mut parts {
            part.extend(self.scenario.stimulus.clocks.iter().map(|clock| clock.net));
        }
        parts
    }
}
