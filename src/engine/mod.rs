//! One run of one case: event queue, kernel, windows, recurrence, trace.
//!
//! The engine gives changes and windows to an [`Observer`] and knows no hazard and no rule.

mod agenda;
mod firing;
mod kernel;
mod level;
mod observer;
mod plan;
mod queue;
mod recovery;
mod recurrence;
mod trace;

use std::sync::Arc;

use kernel::{Anew, Kernel, Many, One};
use level::{Bit, Ternary};
pub use observer::{Cancelled, Closing, Deaf, End, Finish, Hit, Observer, Opening, Site};
use plan::Plan;
use queue::{Sorted, Wheel};
pub use trace::{Arrival, Beyond, Change, Link, Lost, Trace, Window};

use crate::control::Control;
use crate::instance::Instance;
use crate::logic::{Bits, State};
use crate::scenario::{Begin, Scenario};
use crate::statics::{self, NoRest};

/// Nodes up to which pending events are kept in a sorted list.
const LIST_NODES: usize = 96;

/// A scenario made ready to run; share it between threads.
#[derive(Clone, Debug)]
pub struct Program {
    plan: Arc<Plan>,
    ternary: bool,
}

impl Program {
    /// A program for a scenario; if it begins at rest, its start state is found.
    ///
    /// Errors: there is no stable state to begin in, or more than one; see [`NoRest`].
    pub fn new(scenario: &Scenario, control: &Control) -> Result<Program, NoRest> {
        match &scenario.begin {
            Begin::AtRest { named } => {
                let rest = statics::rest(&scenario.circuit, &scenario.stimulus.initial, named, control)?;
                Ok(Program::with_rest(scenario, &rest))
            }
            Begin::Random | Begin::Unknown => Ok(Program::with_rest(scenario, &Bits::default())),
        }
    }

    /// A program that begins at rest in this stable state (all nets), if the scenario begins at rest.
    pub fn with_rest(scenario: &Scenario, rest: &Bits) -> Program {
        Program { plan: Arc::new(Plan::new(scenario, Some(rest))), ternary: scenario.begin == Begin::Unknown }
    }

    /// The state at the start, where it is the same in every run (at rest, or unknown).
    pub fn start(&self) -> Option<&State> {
        self.plan.start.as_ref()
    }

    /// A machine for single runs and sweeps; keep it, it allocates only once. `T` is the observers' tag.
    pub fn machine<T: Copy + Default>(&self) -> Machine<T> {
        let list = self.plan.nodes() <= LIST_NODES;
        self.machine_with(list, self.plan.needs_lists())
    }

    /// A machine with a chosen queue (sorted list, else wheel) and, where one pending event a node would do, lists all
    /// the same. All choices give the same run; for tests and benchmarks.
    pub fn machine_with<T: Copy + Default>(&self, sorted: bool, lists: bool) -> Machine<T> {
        let plan = self.plan.clone();
        let lists = lists || plan.needs_lists();
        let core = match (self.ternary, sorted, lists) {
            (false, true, false) => Core::BitSortedOne(Kernel::new(&plan)),
            (false, true, true) => Core::BitSortedMany(Kernel::new(&plan)),
            (false, false, false) => Core::BitWheelOne(Kernel::new(&plan)),
            (false, false, true) => Core::BitWheelMany(Kernel::new(&plan)),
            (true, true, false) => Core::TernarySortedOne(Kernel::new(&plan)),
            (true, true, true) => Core::TernarySortedMany(Kernel::new(&plan)),
            (true, false, false) => Core::TernaryWheelOne(Kernel::new(&plan)),
            (true, false, true) => Core::TernaryWheelMany(Kernel::new(&plan)),
        };
        Machine { plan, core, anew: None, choice: (self.ternary, sorted) }
    }
}

/// The kernel chosen for a circuit, with its working memory.
pub struct Machine<T> {
    plan: Arc<Plan>,
    core: Core<T>,
    /// For cases whose firings differ; made when the first of them comes.
    anew: Option<Core<T>>,
    /// Three values? Sorted list?
    choice: (bool, bool),
}

enum Core<T> {
    BitSortedOne(Kernel<Bit, Sorted, One, T>),
    BitSortedMany(Kernel<Bit, Sorted, Many, T>),
    BitWheelOne(Kernel<Bit, Wheel, One, T>),
    BitWheelMany(Kernel<Bit, Wheel, Many, T>),
    TernarySortedOne(Kernel<Ternary, Sorted, One, T>),
    TernarySortedMany(Kernel<Ternary, Sorted, Many, T>),
    TernaryWheelOne(Kernel<Ternary, Wheel, One, T>),
    TernaryWheelMany(Kernel<Ternary, Wheel, Many, T>),
    BitSortedAnew(Kernel<Bit, Sorted, Anew, T>),
    BitWheelAnew(Kernel<Bit, Wheel, Anew, T>),
    TernarySortedAnew(Kernel<Ternary, Sorted, Anew, T>),
    TernaryWheelAnew(Kernel<Ternary, Wheel, Anew, T>),
}

impl<T: Copy + Default> Machine<T> {
    /// As [`Machine::run`], for single runs: every observer of one kind of tags shares one kernel, which takes less time to
    /// build and a little more a run.
    pub fn hear(&mut self, instance: &Instance, control: &Control, observer: &mut dyn Observer<Tag = T>) -> bool {
        let mut observer = observer;
        self.run(instance, control, &mut observer)
    }

    /// Runs one case to its end, telling the observer. False: the control cancelled it, and the observer has heard no
    /// [`Observer::finish`].
    pub fn run<O: Observer<Tag = T>>(&mut self, instance: &Instance, control: &Control, observer: &mut O) -> bool {
        let plan = &*self.plan;
        let core = match instance.firings {
            None => &mut self.core,
            Some(_) => self.anew.get_or_insert_with(|| match self.choice {
                (false, true) => Core::BitSortedAnew(Kernel::new(plan)),
                (false, false) => Core::BitWheelAnew(Kernel::new(plan)),
                (true, true) => Core::TernarySortedAnew(Kernel::new(plan)),
                (true, false) => Core::TernaryWheelAnew(Kernel::new(plan)),
            }),
        };
        match core {
            Core::BitSortedOne(kernel) => kernel.run(plan, instance, control, observer),
            Core::BitSortedMany(kernel) => kernel.run(plan, instance, control, observer),
            Core::BitWheelOne(kernel) => kernel.run(plan, instance, control, observer),
            Core::BitWheelMany(kernel) => kernel.run(plan, instance, control, observer),
            Core::TernarySortedOne(kernel) => kernel.run(plan, instance, control, observer),
            Core::TernarySortedMany(kernel) => kernel.run(plan, instance, control, observer),
            Core::TernaryWheelOne(kernel) => kernel.run(plan, instance, control, observer),
            Core::TernaryWheelMany(kernel) => kernel.run(plan, instance, control, observer),
            Core::BitSortedAnew(kernel) => kernel.run(plan, instance, control, observer),
            Core::BitWheelAnew(kernel) => kernel.run(plan, instance, control, observer),
            Core::TernarySortedAnew(kernel) => kernel.run(plan, instance, control, observer),
            Core::TernaryWheelAnew(kernel) => kernel.run(plan, instance, control, observer),
        }
    }
}
