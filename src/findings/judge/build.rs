//! From the questions of a scenario to the judges that answer them.

use super::edges::{MinPulse, Timing};
use super::nets::{Count, NONE, Settle, Watch};
use super::reference::AgainstReference;
use super::sink::Sink;
use super::span::{ConeSet, Cones};
use super::states::{Expect, Never, NotAtRest};
use super::{Ear, Heard, Judge, Usual};
use crate::circuit::NetId;
use crate::engine::End;
use crate::findings::asked::{Asked, RuleKey};
use crate::findings::pulses::Pulses;
use crate::logic::{State, Value};
use crate::scenario::{Before, Begin, Oscillation, Scenario, Swallowed};
use crate::time::{Span, Time};

impl<S: Sink> Judge<S> {
    /// The judges of a scenario, for the questions that [`Asked::of`] made of it.
    pub fn new(scenario: &Scenario, asked: &Asked, sink: S) -> Judge<S> {
        let (circuit, rules, stimulus) = (&*scenario.circuit, &*scenario.rules, &*scenario.stimulus);
        let moments = stimulus.moments.len();
        let by_rule = |rule: RuleKey, index: u32, net: Option<NetId>| {
            let each = (0..moments as u32).map(|moment| asked.find(rule, index, net, Some(moment)).unwrap_or(NONE));
            each.collect::<Vec<u32>>()
        };
        let single = |rule: RuleKey, index: u32, net: Option<NetId>| asked.find(rule, index, net, None).unwrap_or(NONE);

        let mut ears: Vec<Vec<Ear>> = vec![Vec::new(); circuit.net_count()];
        let mut cones = Cones::new();
        let mut watches = Vec::new();
        let mut settles = Vec::new();
        for net in &scenario.watched {
            let cone = cones.of(&[*net]);
            let rule = rules.glitch_free.iter().position(|rule| rule.net == *net);
            ears[net.index()].push(Ear::Watch(watches.len() as u32));
            watches.push(Watch {
                net: *net,
                cone,
                ruled: rule.is_some(),
                bound: rule.map_or(Span::ZERO, |i| rules.glitch_free[i].shorter_than),
                questions: match rule {
                    Some(i) => by_rule(RuleKey::GlitchFree, i as u32, Some(*net)),
                    None => vec![NONE; moments],
                },
                window: None,
                before: Value::X,
                pulses: Pulses::new(rule.map_or(Span::ZERO, |i| rules.glitch_free[i].shorter_than)),
                all: Pulses::all(),
                unknown: false,
            });
            let questions = by_rule(RuleKey::SettleWithin, 0, Some(*net));
            let bound_of = |q: &u32| asked.questions.get(*q as usize).and_then(|q| q.bound).unwrap_or_default();
            let bounds: Vec<Span> = questions.iter().map(bound_of).collect();
            // one judge for the rule, and one for each step with a bound of its own: their windows may differ
            let own = |m: usize| stimulus.step_of(&stimulus.moments[m]).is_some_and(|s| s.settle_within.is_some());
            let mut add = |keep: &dyn Fn(usize) -> bool| {
                let kept = |m: usize| if keep(m) { questions[m] } else { NONE };
                let questions: Vec<u32> = (0..moments).map(kept).collect();
                if questions.iter().any(|q| *q != NONE) {
                    ears[net.index()].push(Ear::Settle(settles.len() as u32));
                    settles.push(Settle {
                        net: *net,
                        cone,
                        questions,
                        bounds: bounds.clone(),
                        window: None,
                        last: None,
                    });
                }
            };
            add(&|m| !own(m));
            for step in (0..moments).filter(|m| own(*m)) {
                add(&|m| m == step);
            }
        }

        let mut counts = Vec::new();
        let mut expects = Vec::new();
        for (s, step) in stimulus.steps.iter().enumerate() {
            let moment = stimulus.moment_of_step(s as u32);
            for wanted in &step.edges {
                ears[wanted.net.index()].push(Ear::Count(counts.len() as u32));
                counts.push(Count {
                    wanted: *wanted,
                    cone: cones.of(&[wanted.net]),
                    moment,
                    question: asked.find(RuleKey::Edges, 0, Some(wanted.net), Some(moment)).unwrap_or(NONE),
                    window: None,
                    transitions: 0,
                    unknown: false,
                });
            }
            if let Some(expect) = &step.expect {
                let nets: Vec<NetId> = expect.alternatives.iter().flatten().map(|(net, _)| *net).collect();
                expects.push(Expect {
                    alternatives: expect.alternatives.clone(),
                    cone: cones.of(&nets),
                    moment,
                    question: asked.find(RuleKey::Expect, 0, None, Some(moment)).unwrap_or(NONE),
                    window: None,
                });
            }
        }
        let at_rest = matches!(scenario.begin, Begin::AtRest { .. });
        let each = rules.never_at_rest.iter().enumerate();
        let not_at_rest = each.map(|(i, rule)| {
            let nets: Vec<NetId> = rule.state.iter().map(|(net, _)| *net).collect();
            NotAtRest {
                pattern: rule.state.clone(),
                cone: cones.of(&nets),
                at_start: single(RuleKey::NeverAtRest, i as u32, None),
                questions: by_rule(RuleKey::NeverAtRest, i as u32, None),
                window: None,
            }
        });
        let not_at_rest: Vec<NotAtRest> = not_at_rest.collect();
        cones.finish(circuit);
        let nevers: Vec<Never> = rules
            .never
            .iter()
            .enumerate()
            .map(|(i, rule)| {
                for (entry, (net, _)) in rule.state.iter().enumerate() {
                    ears[net.index()].push(Ear::Never { test: i as u32, entry: entry as u32 });
                }
                Never::new(rule.state.clone(), rule.longer_than, single(RuleKey::Never, i as u32, None))
            })
            .collect();
        let timings: Vec<Timing> = rules
            .timing
            .iter()
            .enumerate()
            .map(|(i, rule)| {
                ears[rule.from.net.index()].push(Ear::Timing(i as u32));
                if rule.to.net != rule.from.net {
                    ears[rule.to.net.index()].push(Ear::Timing(i as u32));
                }
                let question = single(RuleKey::Timing, i as u32, None);
                Timing::new(rule, circuit.is_input(rule.to.net), question)
            })
            .collect();
        let min_pulses: Vec<MinPulse> = rules
            .min_pulse
            .iter()
            .enumerate()
            .map(|(i, rule)| {
                ears[rule.net.index()].push(Ear::MinPulse(i as u32));
                MinPulse::new(rule, single(RuleKey::MinPulse, i as u32, Some(rule.net)))
            })
            .collect();
        let swallowed_questions: Vec<(Option<NetId>, u32)> = match &rules.swallowed {
            Swallowed::Listed => Vec::new(),
            Swallowed::Forbidden => vec![(None, single(RuleKey::Swallowed, 0, None))],
            Swallowed::At(nets) => {
                nets.iter().map(|net| (Some(*net), single(RuleKey::Swallowed, 0, Some(*net)))).collect()
            }
        };
        let mut by_moment = vec![Vec::new(); moments];
        for (q, question) in asked.questions.iter().enumerate() {
            if let Some(moment) = question.moment
                && question.rule != RuleKey::When
            {
                by_moment[moment as usize].push(q as u32);
            }
        }
        let mut flat = Vec::new();
        let heard = ears.into_iter().zip(circuit.nets()).map(|(list, net)| {
            let first = flat.len() as u32;
            flat.extend(list);
            Heard { first, last: flat.len() as u32, in_loop: circuit.in_loop(net) }
        });
        let heard = heard.collect();
        let said = stimulus.moments.iter().map(|moment| stimulus.step_of(moment).and_then(|step| step.oscillation));
        let own_oscillation = said.clone().map(|own| own.is_some()).collect();
        let oscillation: Vec<Oscillation> = said.map(|own| own.unwrap_or(rules.oscillation)).collect();
        let race_questions = by_rule(RuleKey::CriticalRace, 0, None);
        let oscillation_questions = by_rule(RuleKey::Oscillation, 0, None);
        let before_rest_questions = match rules.before_rest {
            Before::Forbidden => by_rule(RuleKey::BeforeRest, 0, None),
            Before::Allowed => vec![NONE; moments],
        };
        let usual = (0..moments).map(|m| {
            let asked = [before_rest_questions[m], oscillation_questions[m], race_questions[m]];
            // an oscillation that is wanted and did not come is more than routine
            let wanted = oscillation_questions[m] != NONE && oscillation[m] == Oscillation::Required;
            Usual {
                routine: !wanted && scenario.begin != Begin::Unknown,
                questions: asked.into_iter().filter(|question| *question != NONE).collect(),
            }
        });
        let usual = usual.collect();
        let whens = asked.questions.iter().enumerate().filter(|(_, q)| q.rule == RuleKey::When);
        let when_questions = whens.filter_map(|(q, question)| Some((question.moment?, q as u32))).collect();
        Judge {
            sink,
            inputs: circuit.input_count() as u32,
            at_rest,
            oscillation,
            own_oscillation,
            required: asked.find(RuleKey::Oscillation, 0, None, None),
            race_questions,
            oscillation_questions,
            before_rest_questions,
            when_questions,
            swallowed_broken: vec![false; swallowed_questions.len()],
            swallowed_questions,
            by_moment,
            heard,
            ears: flat,
            keeps_values: !nevers.is_empty() || !min_pulses.is_empty(),
            usual,
            touched: ConeSet::none(&cones),
            unclean: ConeSet::none(&cones),
            pending: ConeSet::none(&cones),
            cones,
            only_watches: settles.is_empty() && counts.is_empty() && expects.is_empty() && not_at_rest.is_empty(),
            watches,
            settles,
            counts,
            expects,
            not_at_rest,
            nevers,
            timings,
            min_pulses,
            against_reference: AgainstReference::of(scenario, asked),
            due: 0,
            moment: None,
            opened: Time::ZERO,
            routine: false,
            oscillation_of: Vec::new(),
            run: 0,
            reached: vec![0; moments],
            reached_count: 0,
            values: State::zeros(circuit.net_count()),
            before: State::zeros(circuit.net_count()),
            has_before: false,
            order: 0,
            shut: End::Settled,
            unsettled: false,
            oscillated: false,
            cut: false,
            swallowed: vec![0; circuit.gate_count()],
            swallowing: Vec::new(),
            late: Vec::new(),
        }
    }
}
