//! What is known of whole windows: states at rest and settling times, over all delays.

use std::collections::BTreeSet;

use super::claim::WindowProof;
use super::cycles::RestVerdict;
use super::explored::Mode;
use super::key::bit;
use super::plant::Plant;
use super::prove::{Prover, Unsaid};
use super::watch::Nothing;
use super::watches::Settles;
use crate::circuit::{Circuit, NetId};
use crate::logic::{Bits, State};
use crate::scenario::{Scenario, Step};
use crate::time::Span;

/// States listed of one window, at most.
const STATES: usize = 4096;

impl Prover<'_> {
    /// What is known of whole windows.
    pub(super) fn windows(&mut self) {
        let circuit = self.scenario.circuit.clone();
        let parts = self.parts();
        let steps = self.scenario.stimulus.steps.len();
        let power_up = self.scenario.begin_window().is_some();
        let first = usize::from(!power_up);
        let all = self.scenario.stimulus.moments.len() + first;
        let clocked = all > steps + 1;
        let mut windows: Vec<Window> = vec![Window::default(); all];
        for nets in &parts {
            if self.part(&circuit, nets, &mut windows).is_err() {
                return;
            }
        }
        let coincide: Vec<bool> = match Plant::of(self.scenario, &[], &[]) {
            Ok(plant) => (0..steps).map(|step| plant.may_coincide(step)).collect(),
            Err(_) => return,
        };
        let shared = |taken: usize| {
            let own = taken > 0 && coincide[taken - 1];
            own || coincide.get(taken).is_some_and(|next| *next)
        };
        for (taken, window) in windows.into_iter().enumerate().skip(first) {
            let moment = if power_up { taken } else { taken - 1 } as u32;
            let mut window = window.done(self.scenario, taken, moment);
            // the time counts from the last input change: that of a part may be another than that of the circuit
            let step = self.scenario.stimulus.moments.get(moment as usize);
            let step = step.and_then(|moment| self.scenario.stimulus.step_of(moment));
            let moves_on = step.filter(|step| step.moves_on());
            let apart =
                |step: &Step| parts.len() > 1 || step.set.iter().any(|(net, _)| circuit.readers(*net).is_empty());
            if let (Some(settling), true) = (&mut window.settling, moves_on.is_some_and(apart)) {
                settling.0 = Span::ZERO;
            }
            // steps of one instant share a window, named by the first: which, depends on the run
            if !clocked && shared(taken) {
                (window.states, window.settling) = (None, None);
            }
            // with clocks several parts, or inputs that no gate reads, may stand in many ways to each other
            let unread = |net: NetId| circuit.readers(net).is_empty();
            if clocked && (parts.len() > 1 || circuit.inputs().any(unread)) {
                window.states = None;
            }
            self.proof.windows.push(window);
        }
    }

    fn part(&mut self, circuit: &Circuit, nets: &[NetId], windows: &mut [Window]) -> Result<(), Unsaid> {
        let mut world = self.world(nets, &[])?;
        world.plant = world.plant.asks_all();
        let found = self.explore(&world, &Nothing, Mode::default())?;
        for (taken, window) in windows.iter_mut().enumerate() {
            let mut states: Vec<State> = Vec::new();
            // several steps and edges at one instant are named by the first
            let named = |it: u32| it as usize == taken || it == world.plant.windows + taken as u32;
            for rest in found.rests.keys().filter(|rest| named(rest.steps)) {
                let mut state = State::known(Bits::zeros(circuit.net_count()));
                for (local, net) in world.plant.nets.iter().enumerate() {
                    state.set(net.index(), bit(&found.states[rest.state as usize], local).into());
                }
                if !states.contains(&state) {
                    states.push(state);
                }
            }
            window.join(states, &world.plant.nets);
        }
        // without an end there is no greatest settling time; what takes exactly equal times is left out
        let (verdict, open) = self.comes_to_rest(&world);
        let (joint, ties) = match verdict {
            RestVerdict::Always => (true, false),
            RestVerdict::Cycles(cycles)
                if open.is_empty() && cycles.iter().all(|cycle| cycle.needs_ties == Some(true)) =>
            {
                (false, true)
            }
            RestVerdict::Cycles(_) | RestVerdict::Undecided(_) => {
                windows.iter_mut().for_each(|window| window.settling = Some(None));
                return Ok(());
            }
        };
        let watch = Settles::default();
        self.explore(&world, &watch, Mode { joint, ..Mode::default() })?;
        for (taken, window) in windows.iter_mut().enumerate() {
            let figures = watch.figures.borrow();
            let several = world.plant.windows + taken as u32;
            let named = [taken as u32, several].into_iter().filter_map(|window| figures.get(&window));
            let both = named.copied().reduce(|a, b| [a[0].min(b[0]), a[1].max(b[1])]);
            let these = both.map(|[least, most]| (world.plant.span(least.0), world.plant.span(most.0), !most.1));
            window.settle(these, ties);
        }
        Ok(())
    }
}

/// What the parts of a circuit say of one window, joined.
#[derive(Clone, Debug, Default)]
struct Window {
    /// States, all nets; `None` before the first part, `Some(None)` where there are too many.
    states: Option<Option<Vec<State>>>,
    /// The nets that these parts hold.
    nets: BTreeSet<NetId>,
    /// Least and greatest settling time, and whether the greatest is only come near to.
    settling: Option<Option<(Span, Span, bool)>>,
    ties: bool,
}

impl Window {
    fn join(&mut self, states: Vec<State>, nets: &[NetId]) {
        // parts share what a pattern depends on
        let both: Vec<NetId> = nets.iter().copied().filter(|net| self.nets.contains(net)).collect();
        let fit = |(a, b): &(&State, &State)| both.iter().all(|net| a.get(net.index()) == b.get(net.index()));
        self.nets.extend(nets);
        self.states = Some(match self.states.take() {
            None => Some(states),
            Some(None) => None,
            Some(Some(all)) if all.len().saturating_mul(states.len()) > STATES => {
                let _ = all;
                None
            }
            Some(Some(all)) => {
                let sum = |(a, b): (&State, &State)| {
                    let mut state = a.clone();
                    for net in b.ones.ones() {
                        state.set(net, true.into());
                    }
                    state
                };
                Some(all.iter().flat_map(|a| states.iter().map(move |b| (a, b))).filter(fit).map(sum).collect())
            }
        });
    }

    fn settle(&mut self, figures: Option<(Span, Span, bool)>, ties: bool) {
        self.ties |= ties;
        self.settling = Some(match (self.settling.take(), figures) {
            (None, figures) => figures,
            (Some(None), _) | (_, None) => None,
            (Some(Some(ours)), Some(theirs)) => {
                let most = (ours.1, !ours.2).max((theirs.1, !theirs.2));
                Some((ours.0.max(theirs.0), most.0, !most.1))
            }
        });
    }

    fn done(self, scenario: &Scenario, taken: usize, moment: u32) -> WindowProof {
        // inputs that no gate reads belong to no part
        let mut inputs = scenario.stimulus.initial.clone();
        for step in scenario.stimulus.steps.iter().take(taken) {
            step.set.iter().for_each(|(net, value)| inputs[net.index()] = *value);
        }
        let mut states = self.states.flatten();
        for state in states.iter_mut().flatten() {
            if scenario.stimulus.clocks.is_empty() {
                inputs.iter().enumerate().for_each(|(net, value)| state.set(net, (*value).into()));
            }
        }
        if let Some(states) = &mut states {
            states.sort();
            states.dedup();
        }
        let settling = self.settling.flatten();
        WindowProof {
            moment,
            states,
            settling: settling.map(|(least, most, _)| (least, most)),
            settling_below: settling.is_some_and(|it| it.2),
            settling_but_for_ties: self.ties,
        }
    }
}
