//! The builder: names and raw values in, a checked [`Scenario`] or all faults out.
//!
//! Nothing is checked while it is being told; [`Builder::finish`] checks everything at once, in time linear in what was
//! told. Circuits built in code get the same checks as files.

mod circuit;
mod conditions;
mod context;
mod delays;
mod padding;
mod plot;
mod reference;
mod rules;
mod said;
mod said_rules;
mod stimulus;
#[cfg(test)]
mod tests;

use std::sync::Arc;

pub use conditions::NewCondition;
pub use plot::NewPlot;
pub use said::*;
pub use said_rules::*;
pub use stimulus::MAX_MOMENTS;

use crate::circuit::Function;
use crate::delay::Marginal;
use crate::scenario::{Begin, Fault, Faults, Limits, Mark, Plan, Scenario, Vary};
use crate::time::{Span, Unit};
use context::Context;
use said::NewFunction;
use stimulus::Listed;

/// Collects what is said of a scenario; see [`Builder::finish`].
///
/// ```
/// use stillgate::circuit::Function;
/// use stillgate::scenario::{Builder, NewStep};
///
/// let mut latch = Builder::new("latch of two NORs");
/// latch.input("r", false);
/// latch.input("s", false);
/// latch.gate("q", Function::Nor, ["r", "qn"]).delay(["6", "9", "14"]);   // in ns
/// latch.gate("qn", Function::Nor, ["s", "q"]).rise("7").fall("900 ps");
/// latch.initial("q", false);
/// latch.step(NewStep::at("100").set("s", true).expect([("q", true)]));
/// latch.step(NewStep::rest("0").set("s", false));
/// latch.rules().never([("q", true), ("qn", true)]);
/// let scenario = latch.finish().unwrap();
/// assert_eq!(scenario.stimulus.steps.len(), 2);
///
/// let mut wrong = Builder::new("a slip and a hole");
/// wrong.input("set", false);
/// wrong.gate("q", Function::Not, ["sett"]).delay("0");
/// let faults = wrong.finish().unwrap_err();
/// assert_eq!(faults.len(), 2);
/// assert_eq!(faults[0].help, "did you mean `set`?");
/// ```
#[derive(Clone, Debug)]
pub struct Builder {
    title: String,
    unit: Unit,
    begin: Said<BeginAt>,
    inputs: Vec<(Said<String>, bool)>,
    gates: Vec<NewGate>,
    initial: NewState,
    outputs: Option<Vec<Said<String>>>,
    default_delays: NewDelay,
    function_delays: Vec<(Said<String>, NewDelay)>,
    assume_min: Option<Said<String>>,
    groups: Vec<NewGroup>,
    conditions: Vec<NewCondition>,
    steps: Vec<Listed>,
    clocks: Vec<NewClock>,
    every_change: Option<Mark>,
    rules: NewRules,
    reference: Option<NewReference>,
    padding: Option<Vec<Said<String>>>,
    plot: NewPlot,
    limit_transitions: Said<u64>,
    limit_time: Option<Said<Amount>>,
    samples: Said<u64>,
    seed: u64,
    search: Said<u64>,
    tries: Said<u64>,
    draw: Marginal,
    vary: Vary,
    not_analysed: Vec<Said<String>>,
    notes: Vec<Said<String>>,
    faults: Faults,
}

/// Where a run begins, as it was said; `[initial]` comes apart.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum BeginAt {
    /// In a stable state.
    #[default]
    Rest,
    /// Every gate output is a random bit.
    Random,
    /// Every gate output is X.
    Unknown,
}

impl Builder {
    /// A scenario without inputs, gates or steps; all else has its default, the unit is ns.
    pub fn new(title: impl Into<String>) -> Builder {
        let plan = Plan::default();
        Builder {
            title: title.into(),
            unit: Unit::default(),
            begin: Said::default(),
            inputs: Vec::new(),
            gates: Vec::new(),
            initial: Vec::new(),
            outputs: None,
            default_delays: NewDelay::default(),
            function_delays: Vec::new(),
            assume_min: None,
            groups: Vec::new(),
            conditions: Vec::new(),
            steps: Vec::new(),
            clocks: Vec::new(),
            every_change: None,
            rules: NewRules::default(),
            reference: None,
            padding: None,
            plot: NewPlot::default(),
            limit_transitions: Said::from(Limits::default().transitions),
            limit_time: None,
            samples: Said::from(plan.samples),
            seed: plan.seed,
            search: Said::from(plan.search),
            tries: Said::from(plan.tries),
            draw: plan.draw,
            vary: plan.vary,
            not_analysed: Vec::new(),
            notes: Vec::new(),
            faults: Faults::default(),
        }
    }

    /// Another title.
    pub fn title(&mut self, title: impl Into<String>) -> &mut Builder {
        self.title = title.into();
        self
    }

    /// The unit of every amount told without one, before or after this call, and of all output.
    pub fn unit(&mut self, unit: Unit) -> &mut Builder {
        self.unit = unit;
        self
    }

    /// Where a run begins; default at rest.
    pub fn begin(&mut self, begin: impl Into<Said<BeginAt>>) -> &mut Builder {
        self.begin = begin.into();
        self
    }

    /// An input and its value before the first step. Inputs keep the order of these calls.
    pub fn input(&mut self, name: impl Into<Said<String>>, value: bool) -> &mut Builder {
        self.inputs.push((name.into(), value));
        self
    }

    /// Another value before the first step, for an input that was told.
    pub fn input_begins(&mut self, name: &str, value: bool) -> &mut Builder {
        self.inputs.iter_mut().filter(|(input, _)| input.what == name).for_each(|(_, before)| *before = value);
        self
    }

    /// A gate, which drives the net of its name. Gates keep the order of these calls; pins may name gates to come.
    pub fn gate<P: Into<Said<String>>>(
        &mut self,
        name: impl Into<Said<String>>,
        function: Function,
        pins: impl IntoIterator<Item = P>,
    ) -> &mut NewGate {
        let pins = pins.into_iter().map(Into::into).collect();
        self.push_gate(name.into(), NewFunction::Known(function), pins)
    }

    /// A gate that computes a Boolean expression; see [`Expr::parse`](crate::circuit::Expr::parse).
    pub fn expr(&mut self, name: impl Into<Said<String>>, text: impl Into<Said<String>>) -> &mut NewGate {
        self.push_gate(name.into(), NewFunction::Expr, vec![text.into()])
    }

    /// A gate whose function could not be read, which was reported by [`Builder::faults`]: its net is known to the others.
    pub fn unreadable_gate(&mut self, name: impl Into<Said<String>>) -> &mut NewGate {
        self.push_gate(name.into(), NewFunction::Unreadable, Vec::new())
    }

    fn push_gate(&mut self, name: Said<String>, function: NewFunction, pins: Vec<Said<String>>) -> &mut NewGate {
        self.gates.push(NewGate::new(name, function, pins));
        self.gates.last_mut().expect("just pushed")
    }

    /// A gate's net and its value in the stable state that a run begins in; needed where the inputs allow several.
    pub fn initial(&mut self, net: impl Into<Said<String>>, value: bool) -> &mut Builder {
        self.initial.push((net.into(), value));
        self
    }

    /// One more output. Without any: the gates that no other gate reads, else all gates.
    pub fn output(&mut self, net: impl Into<Said<String>>) -> &mut Builder {
        self.outputs.get_or_insert_default().push(net.into());
        self
    }

    /// There are no outputs but those named by [`Builder::output`], even if none is.
    pub fn only_named_outputs(&mut self) -> &mut Builder {
        self.outputs.get_or_insert_default();
        self
    }

    /// Delays of gates that say nothing themselves.
    pub fn default_delays(&mut self) -> &mut NewDelay {
        &mut self.default_delays
    }

    /// Delays of gates of one function (`nand`, `expr`, …) that say nothing themselves.
    pub fn function_delays(&mut self, function: impl Into<Said<String>>) -> &mut NewDelay {
        self.function_delays.push((function.into(), NewDelay::default()));
        &mut self.function_delays.last_mut().expect("just pushed").1
    }

    /// The minimum as a decimal fraction of typical, above 0 up to 1, where only typical and maximum are told. Default 0.25.
    pub fn assume_min(&mut self, fraction: impl Into<Said<String>>) -> &mut Builder {
        self.assume_min = Some(fraction.into());
        self
    }

    /// Gates whose delays belong together.
    pub fn group(&mut self, group: NewGroup) -> &mut Builder {
        self.groups.push(group);
        self
    }

    /// A condition of temperature or supply, under which every delay is multiplied by a factor.
    pub fn condition(&mut self, condition: NewCondition) -> &mut Builder {
        self.conditions.push(condition);
        self
    }

    /// The next step.
    pub fn step(&mut self, step: NewStep) -> &mut Builder {
        self.steps.push(Listed { times: None, steps: vec![step], mark: Mark::default() });
        self
    }

    /// The next steps, over and over; labels get ` #1`, ` #2`, …
    pub fn repeat(&mut self, times: impl Into<Said<u64>>, steps: Vec<NewStep>) -> &mut Builder {
        let times = times.into();
        self.steps.push(Listed { times: Some(times), steps, mark: times.mark });
        self
    }

    /// A periodic input.
    pub fn clock(&mut self, clock: NewClock) -> &mut Builder {
        self.clocks.push(clock);
        self
    }

    /// In place of steps: every single-input change from every reachable stable state, each at rest. The scenario that
    /// [`Builder::finish`] gives has no steps yet; [`crate::flow::lay_out`] adds them.
    pub fn every_single_change(&mut self, mark: Mark) -> &mut Builder {
        self.every_change = Some(mark);
        self
    }

    /// The rules, to be added to.
    pub fn rules(&mut self) -> &mut NewRules {
        &mut self.rules
    }

    /// The reference network, to be added to.
    pub fn reference(&mut self) -> &mut NewReference {
        self.reference.get_or_insert_default()
    }

    /// Most transitions of nets in one window, at least 1; default 100,000.
    pub fn limit_transitions(&mut self, transitions: impl Into<Said<u64>>) -> &mut Builder {
        self.limit_transitions = transitions.into();
        self
    }

    /// Longest time from a window's start, above 0; default none.
    pub fn limit_time(&mut self, time: impl Into<Said<Amount>>) -> &mut Builder {
        self.limit_time = Some(time.into());
        self
    }

    /// Number of samples of a sweep, at least 1; default 10,000.
    pub fn samples(&mut self, samples: impl Into<Said<u64>>) -> &mut Builder {
        self.samples = samples.into();
        self
    }

    /// Seed of all draws; default 1.
    pub fn seed(&mut self, seed: u64) -> &mut Builder {
        self.seed = seed;
        self
    }

    /// Runs of a directed search for each question, at least [`Plan::LEAST_SEARCH`]; 0: none; default 1,000.
    pub fn search(&mut self, runs: impl Into<Said<u64>>) -> &mut Builder {
        self.search = runs.into();
        self
    }

    /// Samples a board, at least 1; default 1.
    pub fn tries(&mut self, tries: impl Into<Said<u64>>) -> &mut Builder {
        self.tries = tries.into();
        self
    }

    /// How delays spread over their ranges; default uniform.
    pub fn draw(&mut self, draw: Marginal) -> &mut Builder {
        self.draw = draw;
        self
    }

    /// How often the delay of a gate is drawn; default once a board.
    pub fn vary(&mut self, vary: Vary) -> &mut Builder {
        self.vary = vary;
        self
    }

    /// Something that was told elsewhere and is not analysed yet: a whole sentence for the scenario's list.
    pub fn not_analysed(&mut self, sentence: impl Into<Said<String>>) -> &mut Builder {
        self.not_analysed.push(sentence.into());
        self
    }

    /// Something that the user should know: a whole sentence for the scenario's notes.
    pub fn note(&mut self, sentence: impl Into<Said<String>>) -> &mut Builder {
        self.notes.push(sentence.into());
        self
    }

    /// Where delay may be added to cure what a proof refutes, and nowhere else: gates by name, wires as `net -> gate`.
    pub fn padding(&mut self, allow: impl IntoIterator<Item = Said<String>>) -> &mut Builder {
        self.padding = Some(allow.into_iter().collect());
        self
    }

    /// What pictures of waves show: nets in the order of their lanes, and a span of time.
    pub fn plot(&mut self, plot: NewPlot) -> &mut Builder {
        self.plot = plot;
        self
    }

    /// Faults found elsewhere: [`Builder::finish`] fails with them and its own.
    pub fn faults(&mut self, faults: Faults) -> &mut Builder {
        self.faults.append(faults);
        self
    }

    /// Checks everything.
    ///
    /// Errors: all faults, those handed in by [`Builder::faults`] first; beyond [`MAX_FAULTS`](super::MAX_FAULTS) they
    /// are only counted.
    pub fn finish(mut self) -> Result<Scenario, Vec<Fault>> {
        let faults = std::mem::take(&mut self.faults);
        let nets = circuit::names(&self.inputs, &self.gates);
        let mut context = Context::new(nets, self.unit, faults);
        context.not_analysed = std::mem::take(&mut self.not_analysed);
        context.notes = std::mem::take(&mut self.notes);

        let network = circuit::network(&mut context, &self.inputs, &self.gates, 0);
        let mut delays = delays::model(&mut context, &self, &network);
        delays.model.groups = delays::groups(&mut context, &self.groups);
        let conditions = conditions::check(&mut context, &self.conditions, &delays.model);
        let outputs = circuit::outputs(&mut context, self.outputs.as_deref(), &network);
        let begin = self.begin_of(&mut context);
        let padding = padding::check(&mut context, self.padding.as_deref(), &network);
        let plot = plot::check(&mut context, &self.plot);
        let stimulus = stimulus::check(&mut context, &self, &delays);
        let rules = rules::check(&mut context, &self.rules, &outputs);
        let reference = reference::check(&mut context, &self, &outputs);
        let limits = self.limits(&mut context);
        let plan = self.plan(&mut context);

        let built = network.build(&mut context);
        let (Some(circuit), true) = (built, context.faults.is_empty()) else {
            return Err(context.faults.into_vec());
        };
        let mut watched: Vec<_> = outputs.iter().copied().chain(rules.glitch_free.iter().map(|g| g.net)).collect();
        watched.sort_unstable();
        watched.dedup();
        let in_order = |mut said: Vec<Said<String>>| {
            said.sort_by_key(|sentence| sentence.mark);
            said.into_iter().map(|sentence| sentence.what).collect()
        };
        Ok(Scenario {
            title: self.title,
            unit: self.unit,
            circuit: Arc::new(circuit),
            delays: Arc::new(delays.model),
            stimulus: Arc::new(stimulus),
            rules: Arc::new(rules),
            outputs,
            watched,
            begin,
            reference: reference.map(Arc::new),
            limits,
            plan,
            padding,
            plot,
            conditions,
            notes: in_order(context.notes),
            not_analysed: in_order(context.not_analysed),
        })
    }

    fn begin_of(&self, context: &mut Context<'_>) -> Begin {
        let help = "`initial` names gates; the value of an input before the first step stands with the input";
        let mut named = context.state(&self.initial);
        for (net, _) in &self.initial {
            if context.nets.ids.get(net.what.as_str()).is_some_and(|id| context.is_input(*id)) {
                context.gate(net, help);
            }
        }
        named.retain(|(id, _)| !context.is_input(*id));
        if self.begin.what != BeginAt::Rest && !named.is_empty() {
            context.note(self.initial[0].0.mark, "`initial` has no effect: the run does not begin at rest");
        }
        if self.begin.what == BeginAt::Unknown {
            let inertial = |filter: &Said<NewFilter>| filter.what == NewFilter::Inertial;
            for gate in &self.gates {
                if let Some(filter) = gate.filter.as_ref().filter(|filter| !inertial(filter)) {
                    let message =
                        format!("a run that begins unknown needs inertial gates; `{}` is not", gate.name.what);
                    let help = "use `begin = \"random\"`, or leave its filter out";
                    context
                        .faults
                        .push(Fault::new(filter.mark, message, help).related(self.begin.mark, "begins unknown"));
                }
            }
        }
        match self.begin.what {
            BeginAt::Rest => Begin::AtRest { named },
            BeginAt::Random => Begin::Random,
            BeginAt::Unknown => Begin::Unknown,
        }
    }

    fn limits(&self, context: &mut Context<'_>) -> Limits {
        let transitions = self.limit_transitions;
        if transitions.what == 0 {
            context.faults.add(transitions.mark, "a window of no transitions is no window", "allow at least 1");
        }
        let time = self.limit_time.as_ref().and_then(|time| context.span(time));
        if let (Some(Span::ZERO), Some(said)) = (time, &self.limit_time) {
            context.faults.add(said.mark, "a window of no time is no window", "allow some time, or leave `time` out");
        }
        Limits { transitions: transitions.what, time }
    }

    fn plan(&self, context: &mut Context<'_>) -> Plan {
        if self.samples.what == 0 {
            context.faults.add(self.samples.mark, "the sweep is empty", "draw at least 1 sample");
        }
        if self.tries.what == 0 {
            context.faults.add(self.tries.mark, "a board without tries", "give each board at least 1 try");
        }
        if (1..Plan::LEAST_SEARCH).contains(&self.search.what) {
            let remedy = format!("give each question at least {} runs, or 0 for no search", Plan::LEAST_SEARCH);
            context.faults.add(self.search.mark, "a search of so few runs finds nothing", &remedy);
        }
        let (samples, tries, search) = (self.samples.what, self.tries.what, self.search.what);
        Plan { samples, seed: self.seed, tries, draw: self.draw, vary: self.vary, search }
    }
}
