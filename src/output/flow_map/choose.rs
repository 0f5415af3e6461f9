//! What of a table is drawn.

use std::collections::BTreeSet;

use super::arrows::{Arrow, Arrows, Place};
use super::{MOST_ARROWS, MOST_BOXES, MOST_COLUMNS, Map};
use crate::flow::StateNumber;
use crate::logic::Bits;

/// How much of the table is drawn.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Extent {
    /// All states that the table has.
    Whole,
    /// What the steps touch.
    Steps,
    /// There is no step: the first states that fit.
    First,
}

/// What is drawn, and what is not.
pub(super) struct Chosen {
    pub extent: Extent,
    /// Ascending.
    pub states: Vec<StateNumber>,
    pub steps: Vec<Arrow>,
    pub single: Vec<Arrow>,
    /// Arrows of steps for which there was no room.
    pub steps_left_out: usize,
    /// Changes that no step makes and that are not drawn.
    pub single_left_out: usize,
    /// Steps that change nothing where they come.
    pub idle: usize,
}

/// The inputs of a state.
pub(super) fn inputs(map: &Map<'_>, number: StateNumber) -> Bits {
    let values = &map.flow.table.states[number as usize].values;
    Bits::of(map.scenario.circuit.inputs().map(|net| values.get(net.index())))
}

/// States and columns that have been taken.
#[derive(Clone, Default)]
struct Taken {
    states: BTreeSet<StateNumber>,
    columns: BTreeSet<Bits>,
}

impl Taken {
    /// Takes these if there is room for all of them.
    fn take(&mut self, map: &Map<'_>, states: impl Iterator<Item = StateNumber>, column: Option<&Bits>) -> bool {
        let new: BTreeSet<StateNumber> =
            states.filter(|number| !self.states.contains(number)).take(MOST_BOXES + 1).collect();
        let columns = new.iter().map(|number| inputs(map, *number)).chain(column.cloned());
        let columns: BTreeSet<Bits> = columns.filter(|column| !self.columns.contains(column)).collect();
        let fits = self.states.len() + new.len() <= MOST_BOXES && self.columns.len() + columns.len() <= MOST_COLUMNS;
        if fits {
            self.states.extend(new);
            self.columns.extend(columns);
        }
        fits
    }

    fn take_arrow(&mut self, map: &Map<'_>, arrow: &Arrow) -> bool {
        let to = arrow.to.iter().filter_map(|place| match place {
            Place::State(number) => Some(*number),
            _ => None,
        });
        self.take(map, std::iter::once(arrow.from).chain(to), Some(&arrow.inputs))
    }
}

impl Chosen {
    pub fn of(map: &Map<'_>) -> Chosen {
        let table = &map.flow.table;
        let Arrows { steps, single, idle } = Arrows::of(map.scenario, table);
        let mut taken = Taken::default();
        let whole = table.states.len() <= MOST_BOXES && steps.len() <= MOST_ARROWS && {
            let all = 0..table.states.len() as StateNumber;
            taken.take(map, all, None) && steps.iter().chain(&single).all(|arrow| taken.take_arrow(map, arrow))
        };
        if whole {
            let (single, left_out) = if single.len() > MOST_ARROWS { (Vec::new(), single.len()) } else { (single, 0) };
            return Chosen {
                extent: Extent::Whole,
                states: taken.states.into_iter().collect(),
                steps,
                single,
                steps_left_out: 0,
                single_left_out: left_out,
                idle,
            };
        }
        let mut taken = Taken::default();
        for start in &table.start {
            taken.take(map, std::iter::once(*start), None);
        }
        let mut fitting = |arrows: Vec<Arrow>| {
            let all = arrows.len();
            let mut kept: Vec<Arrow> = arrows.into_iter().filter(|arrow| taken.take_arrow(map, arrow)).collect();
            kept.truncate(MOST_ARROWS);
            let left_out = all - kept.len();
            (kept, left_out)
        };
        let extent = if steps.is_empty() { Extent::First } else { Extent::Steps };
        let many = single.len();
        let (steps, steps_left_out) = fitting(steps);
        let (single, single_left_out) = if extent == Extent::First { fitting(single) } else { (Vec::new(), many) };
        let states = taken.states.into_iter().collect();
        Chosen { extent, states, steps, single, steps_left_out, single_left_out, idle }
    }
}
