//! What is varied: named in the user's words, found in the scenario.

use super::LimitError;
use super::places::{Places, fs};
use crate::circuit::NetId;
use crate::scenario::{MomentKind, Place, Scenario, Step, Stimulus, nearest};

/// The figure of a scenario that is varied. Steps, moments and clocks by number.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Parameter {
    /// How long a step comes after the one before it; the first counts from 0. Steps after it keep their distances.
    Spacing {
        /// The step.
        step: u32,
    },
    /// The shortest of all distances between steps; the others change in proportion.
    SpacingOfAll,
    /// From the step that sets an input to the one that sets it back. All steps after the first of them keep their
    /// distances from the second.
    Pulse {
        /// The input.
        net: NetId,
        /// The step that sets it.
        from: u32,
        /// The step that sets it back.
        to: u32,
    },
    /// The time high of a clock; the period stays.
    High {
        /// The clock.
        clock: u32,
    },
    /// The typical period of a clock; its range and the time high change in proportion, the first edge and jitter stay.
    Period {
        /// The clock.
        clock: u32,
    },
    /// The upper end of a step's skew.
    Skew {
        /// The step.
        step: u32,
    },
    /// How long a step comes before a moment (setup), or after it (hold); negative: on its other side. All other steps and
    /// the clocks stay where they are.
    Distance {
        /// The step that moves.
        step: u32,
        /// The moment that it is measured against: a step or a clock edge.
        to: u32,
        /// Before it, or after it?
        side: Side,
    },
}

/// On which side of a moment a distance counts as positive.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// The step comes before the moment.
    Lead,
    /// The step comes after it.
    Lag,
}

/// Which end of a range asks less of the circuit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Easy {
    /// Long times.
    Long,
    /// Short times.
    Short,
}

/// The words that name a kind of parameter, and what must follow each.
const KINDS: [(&str, &str); 6] = [
    ("spacing", "STEP, or `all`"),
    ("pulse", "NET, or NET STEP STEP"),
    ("period", "CLOCK"),
    ("skew", "STEP"),
    ("lead", "STEP EDGE"),
    ("lag", "STEP EDGE"),
];

impl Parameter {
    /// The parameter that some words name: `spacing STEP`, `spacing all`, `pulse NET`, `pulse NET STEP STEP`,
    /// `period CLOCK`, `skew STEP`, `lead STEP EDGE`, `lag STEP EDGE`. Steps and edges are named by their labels, nets and
    /// clocks by the net.
    ///
    /// Errors: [`LimitError::Bad`] with what is wrong and the nearest name.
    pub fn named(words: &[&str], scenario: &Scenario) -> Result<Parameter, LimitError> {
        let find = Find { scenario };
        match words {
            ["spacing", "all"] if find.find_step("all").is_none() => all(scenario),
            ["spacing", step] => find.spacing(step),
            ["pulse", net] => find.pulse(net, None),
            ["pulse", net, from, to] => find.pulse(net, Some((from, to))),
            ["period", clock] => Ok(Parameter::Period { clock: find.clock(clock)? }),
            ["skew", step] => find.skew(step),
            ["lead", step, to] => find.distance(step, to, Side::Lead),
            ["lag", step, to] => find.distance(step, to, Side::Lag),
            [kind, ..] => match KINDS.iter().find(|it| it.0 == *kind) {
                Some((kind, names)) => bad(format!("`{kind}` needs {names}")),
                None => {
                    let kinds = KINDS.map(|it| it.0);
                    let remedy = match nearest(kind, kinds) {
                        Some(like) => format!("did you mean `{like}`?"),
                        None => format!("one of {} can be varied", kinds.join(", ")),
                    };
                    bad(format!("there is no `{kind}` to vary; {remedy}"))
                }
            },
            [] => bad("name what to vary, as in `spacing STEP`".to_string()),
        }
    }

    /// The parameter in words: `spacing of step both call`, `lead of step data before c rise 1`.
    pub fn words(&self, scenario: &Scenario) -> String {
        let stimulus = &scenario.stimulus;
        let step = |number: u32| step_words(&stimulus.steps[number as usize]);
        let clock = |number: u32| scenario.circuit.name(stimulus.clocks[number as usize].net);
        match *self {
            Parameter::Spacing { step: number } => format!("spacing of {}", step(number)),
            Parameter::SpacingOfAll => "spacing of all steps (the shortest)".to_string(),
            Parameter::Pulse { net, from, to } => {
                format!("pulse of {} from {} to {}", scenario.circuit.name(net), step(from), step(to))
            }
            Parameter::High { clock: number } => format!("time high of clock {}", clock(number)),
            Parameter::Period { clock: number } => format!("period of clock {}", clock(number)),
            Parameter::Skew { step: number } => format!("skew of {}", step(number)),
            Parameter::Distance { step: number, to, side } => {
                let moment = &stimulus.moments[to as usize];
                let to = match stimulus.step_of(moment) {
                    Some(step) => step_words(step),
                    None => moment.label.clone(),
                };
                match side {
                    Side::Lead => format!("lead of {} before {to}", step(number)),
                    Side::Lag => format!("lag of {} after {to}", step(number)),
                }
            }
        }
    }

    /// The first word that names it, as on the command line.
    pub const fn kind(&self) -> &'static str {
        match self {
            Parameter::Spacing { .. } | Parameter::SpacingOfAll => "spacing",
            Parameter::Pulse { .. } | Parameter::High { .. } => "pulse",
            Parameter::Period { .. } => "period",
            Parameter::Skew { .. } => "skew",
            Parameter::Distance { side: Side::Lead, .. } => "lead",
            Parameter::Distance { side: Side::Lag, .. } => "lag",
        }
    }

    /// Which end of a range asks less of the circuit: short skew, all else long.
    pub const fn easy(&self) -> Easy {
        match self {
            Parameter::Skew { .. } => Easy::Short,
            _ => Easy::Long,
        }
    }

    /// May it pass through zero?
    pub(super) const fn is_signed(&self) -> bool {
        matches!(self, Parameter::Distance { .. })
    }

    /// Its typical value in the scenario as it is, in fs; `None` where that is not known before a run.
    pub fn own(&self, scenario: &Scenario) -> Option<i64> {
        let stimulus = &*scenario.stimulus;
        let places = Places::of(stimulus);
        let fs = match *self {
            Parameter::Spacing { step } => typical_distance(stimulus, &places, step as usize),
            Parameter::SpacingOfAll => shortest(stimulus, &places),
            Parameter::Pulse { from, to, .. } => {
                (from + 1..=to).map(|s| typical_distance(stimulus, &places, s as usize)).sum()
            }
            Parameter::High { clock } => Some(fs(stimulus.clocks[clock as usize].high.typ)),
            Parameter::Period { clock } => Some(fs(stimulus.clocks[clock as usize].period.typ)),
            Parameter::Skew { step } => stimulus.steps[step as usize].skew.map(|skew| fs(skew.max)),
            Parameter::Distance { step, to, side } => {
                let to = instant_of(scenario, &places, to).ok();
                let here = typical_in_chain(stimulus, &places, step as usize);
                match (to, here) {
                    (Some((chain, to)), Some((same, here))) if chain == same => {
                        Some(if side == Side::Lead { to - here } else { here - to })
                    }
                    _ => None,
                }
            }
        };
        fs.and_then(|fs| i64::try_from(fs).ok())
    }
}

/// A step by its label; a label that says by itself what it is stands alone.
fn step_words(step: &Step) -> String {
    if step.label.starts_with("step ") { step.label.clone() } else { format!("step {}", step.label) }
}

fn bad<T>(message: String) -> Result<T, LimitError> {
    Err(LimitError::Bad(message))
}

/// From the step before to this one in a typical run, as the file says.
pub(super) fn typical_distance(stimulus: &Stimulus, places: &Places, step: usize) -> Option<i128> {
    match &stimulus.steps[step].place {
        Place::After(range) => Some(fs(range.typ)),
        Place::At(range) => places.typical_before(step).map(|before| fs(range.typ) - before),
        Place::Rest(_) | Place::When { .. } => None,
    }
}

/// The shortest typical distance above 0 between two steps that are placed by `at` or `after`.
pub(super) fn shortest(stimulus: &Stimulus, places: &Places) -> Option<i128> {
    let each = (1..stimulus.steps.len()).filter_map(|s| typical_distance(stimulus, places, s));
    each.filter(|distance| *distance > 0).min()
}

/// Where a step typically is in the chain of the step before it.
pub(super) fn typical_in_chain(stimulus: &Stimulus, places: &Places, step: usize) -> Option<(usize, i128)> {
    match &stimulus.steps[step].place {
        Place::At(range) => Some((0, fs(range.typ))),
        Place::After(range) => {
            let (chain, before) = places.before(step);
            Some((chain, before + fs(range.typ)))
        }
        Place::Rest(_) | Place::When { .. } => None,
    }
}

/// Chain and place of a moment that always comes at the same place; else what to do about it.
pub(super) fn instant_of(scenario: &Scenario, places: &Places, moment: u32) -> Result<(usize, i128), String> {
    let stimulus = &*scenario.stimulus;
    let moment = &stimulus.moments[moment as usize];
    match moment.kind {
        MomentKind::PowerUp => Ok((0, 0)),
        MomentKind::Step(step) => Ok(places.at(step as usize)),
        MomentKind::Edge { clock, edge } => {
            let clock = &stimulus.clocks[clock as usize];
            let needs_high = edge % 2 == 1;
            let exact = clock.first.is_exact()
                && (clock.period.is_exact() || (edge == 0))
                && (clock.high.is_exact() || !needs_high)
                && clock.jitter.fs() == 0;
            if !exact {
                return Err(format!(
                    "`{}` comes at a drawn time; give the clock an exact first edge and period, and no jitter",
                    moment.label
                ));
            }
            let initial = stimulus.initial[clock.net.index()];
            let (period, high) = (fs(clock.period.typ), fs(clock.high.typ));
            let half = if initial { period - high } else { high };
            let whole = i128::from(edge / 2) * period;
            Ok((0, fs(clock.first.typ) + whole + if needs_high { half } else { 0 }))
        }
    }
}

fn all(scenario: &Scenario) -> Result<Parameter, LimitError> {
    let places = Places::of(&scenario.stimulus);
    match shortest(&scenario.stimulus, &places) {
        Some(_) => Ok(Parameter::SpacingOfAll),
        None => {
            bad("no two steps have a distance to vary: none is placed by `at` or `after` behind another".to_string())
        }
    }
}

/// Looks names up.
struct Find<'a> {
    scenario: &'a Scenario,
}

impl Find<'_> {
    fn find_step(&self, label: &str) -> Option<u32> {
        self.scenario.stimulus.steps.iter().position(|step| step.label == label).map(|s| s as u32)
    }

    fn step(&self, label: &str) -> Result<u32, LimitError> {
        let steps = &self.scenario.stimulus.steps;
        self.find_step(label).ok_or_else(|| {
            let like = nearest(label, steps.iter().map(|step| step.label.as_str()));
            unknown("step", label, like, steps.is_empty().then_some("the scenario has no steps"))
        })
    }

    fn spacing(&self, label: &str) -> Result<Parameter, LimitError> {
        let step = self.step(label)?;
        self.placed(step)?;
        Ok(Parameter::Spacing { step })
    }

    /// A step that is placed by a time.
    fn placed(&self, step: u32) -> Result<(), LimitError> {
        let found = &self.scenario.stimulus.steps[step as usize];
        match found.place {
            Place::At(_) | Place::After(_) => Ok(()),
            Place::Rest(_) => bad(format!(
                "step `{}` comes at rest, so it has no distance from the step before; place it by `after`",
                found.label
            )),
            Place::When { .. } => bad(format!(
                "step `{}` waits for a pattern, so it has no distance from the step before; place it by `after`",
                found.label
            )),
        }
    }

    fn skew(&self, label: &str) -> Result<Parameter, LimitError> {
        let step = self.step(label)?;
        let found = &self.scenario.stimulus.steps[step as usize];
        match (found.skew, found.set.len()) {
            (_, ..2) => bad(format!("step `{label}` sets one input, which skew does not move")),
            (None, _) => bad(format!("step `{label}` has no skew; write `skew = [0, 1]` in the file, to be varied")),
            _ => Ok(Parameter::Skew { step }),
        }
    }

    fn net(&self, name: &str) -> Result<NetId, LimitError> {
        let circuit = &self.scenario.circuit;
        let net = circuit
            .net(name)
            .ok_or_else(|| unknown("net", name, nearest(name, circuit.nets().map(|net| circuit.name(net))), None))?;
        match circuit.driver(net) {
            Some(_) => bad(format!("`{name}` is driven by a gate; only inputs are varied")),
            None => Ok(net),
        }
    }

    fn clock_of(&self, net: NetId) -> Option<u32> {
        self.scenario.stimulus.clocks.iter().position(|clock| clock.net == net).map(|c| c as u32)
    }

    fn clock(&self, name: &str) -> Result<u32, LimitError> {
        let circuit = &self.scenario.circuit;
        let clocks = &self.scenario.stimulus.clocks;
        let found = circuit.net(name).and_then(|net| self.clock_of(net));
        found.ok_or_else(|| {
            let like = nearest(name, clocks.iter().map(|clock| circuit.name(clock.net)));
            unknown("clock", name, like, clocks.is_empty().then_some("the scenario has no clocks"))
        })
    }

    fn pulse(&self, name: &str, ends: Option<(&str, &str)>) -> Result<Parameter, LimitError> {
        let net = self.net(name)?;
        if let Some(clock) = self.clock_of(net) {
            return match ends {
                None => Ok(Parameter::High { clock }),
                Some(_) => bad(format!("`{name}` is driven by a clock; write `pulse {name}` for its time high")),
            };
        }
        let stimulus = &*self.scenario.stimulus;
        let sets = |step: &Step| step.set.iter().find(|set| set.0 == net).map(|set| set.1);
        let (from, to) = match ends {
            Some((from, to)) => (self.step(from)?, self.step(to)?),
            None => {
                let each: Vec<u32> =
                    (0..).zip(&stimulus.steps).filter(|(_, step)| sets(step).is_some()).map(|it| it.0).collect();
                match each[..] {
                    [from, to] => (from, to),
                    _ => {
                        let many = each.len();
                        return bad(format!(
                            "{many} steps set `{name}`, not two; name both, as in `pulse {name} STEP STEP`"
                        ));
                    }
                }
            }
        };
        let step = |number: u32| &stimulus.steps[number as usize];
        match (sets(step(from)), sets(step(to))) {
            (Some(a), Some(b)) if a != b && from < to => {}
            (Some(_), Some(_)) if from >= to => {
                return bad(format!("step `{}` does not come before step `{}`", step(from).label, step(to).label));
            }
            (Some(_), Some(_)) => {
                let (from, to) = (&step(from).label, &step(to).label);
                return bad(format!("steps `{from}` and `{to}` set `{name}` to the same value: that is no pulse"));
            }
            (a, _) => {
                let label = &step(if a.is_none() { from } else { to }).label;
                return bad(format!("step `{label}` does not set `{name}`"));
            }
        }
        let places = Places::of(stimulus);
        for number in from + 1..=to {
            self.placed(number)?;
            if number > from + 1 && places.distance(number as usize).is_none() {
                let label = &step(number).label;
                return bad(format!(
                    "step `{label}` comes at a drawn time within the pulse; give it an exact place, by `after`"
                ));
            }
        }
        Ok(Parameter::Pulse { net, from, to })
    }

    fn distance(&self, label: &str, to: &str, side: Side) -> Result<Parameter, LimitError> {
        let stimulus = &*self.scenario.stimulus;
        let step = self.step(label)?;
        self.placed(step)?;
        let moments = &stimulus.moments;
        let found = moments.iter().position(|moment| moment.label == to).ok_or_else(|| {
            let like = nearest(to, moments.iter().map(|moment| moment.label.as_str()));
            unknown("step or clock edge", to, like, None)
        })?;
        if moments[found].kind == MomentKind::Step(step) {
            return bad(format!("step `{label}` has no distance from itself"));
        }
        let places = Places::of(stimulus);
        let instant = instant_of(self.scenario, &places, found as u32).map_err(LimitError::Bad)?;
        let here = typical_in_chain(stimulus, &places, step as usize);
        if here.map(|here| here.0) != Some(instant.0) {
            return bad(format!(
                "the time between step `{label}` and `{to}` is drawn or not known before a run; give the steps between \
                 them exact places, by `at` or `after`"
            ));
        }
        Ok(Parameter::Distance { step, to: found as u32, side })
    }
}

fn unknown(what: &str, name: &str, like: Option<&str>, none: Option<&str>) -> LimitError {
    let remedy = match (like, none) {
        (Some(like), _) => format!("; did you mean `{like}`?"),
        (None, Some(none)) => format!("; {none}"),
        (None, None) => String::new(),
    };
    LimitError::Bad(format!("there is no {what} `{name}`{remedy}"))
}
