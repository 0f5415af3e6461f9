//! What a trace must do besides going its way, for a rule with a length to be broken: conditions on the times of its
//! blocks.

use super::explored::Fired;
use super::key::{Mover, bit};
use super::plant::Plant;
use super::system::{Form, System};
use super::watches::Edge;

/// What the end of a trace must show.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Goal {
    /// That it was reached.
    Reached,
    /// The net changes later than this after the last input change of the step before.
    Late {
        /// The net, by its number in the plant.
        net: u32,
        /// The bound, in ticks.
        bound: i64,
    },
    /// A low or high of the net ends that is shorter than its bound (`[low, high]`, in ticks).
    Short {
        /// The net, by its number in the plant.
        net: u32,
        /// The bounds.
        least: [i64; 2],
    },
    /// In the last window that touches it the net has no pulse that is shorter than this.
    Wide {
        /// The net, by its number in the plant.
        net: u32,
        /// The bound, in ticks.
        least: i64,
    },
    /// The second edge comes sooner than this after the first.
    Close {
        /// The earlier edge.
        from: Edge,
        /// The later edge.
        to: Edge,
        /// The least distance, in ticks.
        min: i64,
    },
    /// The first edge is not answered within this time.
    Open {
        /// The edge that asks.
        from: Edge,
        /// The edge that answers.
        to: Edge,
        /// The greatest distance, in ticks.
        max: i64,
    },
    /// The pattern that the next step waits for does not come.
    Missed {
        /// The nets of the pattern, by their number in the plant.
        nets: Vec<u32>,
        /// How long after the step before it gives up, in ticks; without, the run ends at rest or goes on for ever.
        timeout: Option<i64>,
    },
    /// A partial state shows for longer than this.
    Long {
        /// Nets by their number in the plant, and values.
        pattern: Vec<(u32, bool)>,
        /// The bound, in ticks.
        longer: i64,
    },
}

/// A trace with the values before each of its blocks.
struct Walked<'a> {
    trace: &'a [Fired],
    start: &'a [u64],
}

impl Walked<'_> {
    fn before(&self, block: usize) -> &[u64] {
        block.checked_sub(1).map_or(self.start, |before| &self.trace[before].values)
    }

    /// The new value of a net in a block, if it changes there.
    fn change(&self, net: u32, block: usize) -> Option<bool> {
        let (old, new) = (bit(self.before(block), net as usize), bit(&self.trace[block].values, net as usize));
        (old != new).then_some(new)
    }

    fn has(&self, edge: Edge, block: usize) -> bool {
        self.change(edge.net, block).is_some_and(|new| edge.kind.is(new))
    }
}

impl Goal {
    /// Forms that must be below 0, each list one way to reach the goal.
    pub(super) fn ways(&self, plant: &Plant, system: &System, start: &[u64], trace: &[Fired]) -> Vec<Vec<Form>> {
        let walked = Walked { trace, start };
        let Some(last) = trace.len().checked_sub(1) else { return vec![Vec::new()] };
        let time = |block: usize| &system.times[block];
        // b − a − c, and c − (b − a)
        let sooner = |a: &Form, b: &Form, c: i64| b.minus(a).with(-c);
        let later = |a: &Form, b: &Form, c: i64| a.minus(b).with(c);
        // what pends must wait: that of these nets, else all of it
        let waiting = |nets: &dyn Fn(u32) -> bool| -> Vec<Form> {
            let of = |gate: u32| nets((plant.inputs + gate as usize) as u32);
            let any = system.pending.iter().any(|(gate, _)| of(*gate));
            system.pending.iter().filter(|(gate, _)| !any || of(*gate)).map(|(_, due)| due.clone()).collect()
        };
        match self {
            Goal::Reached => vec![Vec::new()],
            Goal::Late { bound, .. } => {
                let begin = (0..last).rev().find(|block| trace[*block].movers.iter().any(Mover::moves_inputs));
                begin.map_or_else(Vec::new, |begin| vec![vec![later(time(begin), time(last), *bound)]])
            }
            Goal::Short { net, least } => {
                let begin = (0..last).rev().find(|block| walked.change(*net, *block).is_some());
                match (begin, walked.change(*net, last)) {
                    (Some(begin), Some(new)) => vec![vec![sooner(time(begin), time(last), least[usize::from(!new)])]],
                    _ => Vec::new(),
                }
            }
            Goal::Wide { net, least } => {
                let opens = |mover: &Mover| matches!(mover, Mover::Step(_) | Mover::Edge(_));
                let begin = (0..=last).rev().find(|block| trace[*block].movers.iter().any(opens)).unwrap_or(0);
                let changes: Vec<usize> =
                    (begin..=last).filter(|block| walked.change(*net, *block).is_some()).collect();
                // as wide as the bound is too wide: a tick less is asked for, the run decides
                let wide = |pair: &[usize]| later(time(pair[0]), time(pair[1]), least - 1);
                vec![changes.windows(2).map(wide).collect()]
            }
            Goal::Close { from, to, min } => {
                // what shows at one instant needs no condition
                let begin = (0..last).rev().find(|block| walked.has(*from, *block));
                match begin.filter(|_| walked.has(*to, last)) {
                    Some(begin) => vec![vec![sooner(time(begin), time(last), *min)]],
                    None => vec![Vec::new()],
                }
            }
            Goal::Open { from, to, max } => {
                let answered = (0..last).rev().find(|block| walked.has(*to, *block)).map_or(0, |block| block + 1);
                let Some(begin) = (answered..=last).find(|block| walked.has(*from, *block)) else { return Vec::new() };
                let begin = time(begin);
                if walked.has(*to, last) {
                    return vec![vec![later(begin, time(last), *max)]];
                }
                vec![waiting(&|net| net == to.net).iter().map(|due| later(begin, due, *max)).collect()]
            }
            Goal::Missed { nets, timeout } => {
                let Some(timeout) = timeout else { return vec![Vec::new()] };
                let steps = |mover: &Mover| matches!(mover, Mover::Step(_));
                let step = (0..=last).rev().find(|block| trace[*block].movers.iter().any(steps));
                let end = step.map_or_else(Form::default, |block| time(block).clone()).with(*timeout);
                let of = |gate: &u32| nets.contains(&((plant.inputs + *gate as usize) as u32));
                let pending = system.pending.iter().filter(|(gate, _)| of(gate));
                vec![pending.map(|(_, due)| end.minus(due)).collect()]
            }
            Goal::Long { pattern, longer } => {
                let shows = |values: &[u64]| pattern.iter().all(|(net, value)| bit(values, *net as usize) == *value);
                let mut ways = Vec::new();
                let since = |end: usize| (0..end).rev().find(|block| !shows(walked.before(*block)));
                if shows(walked.before(last))
                    && let Some(begin) = since(last)
                {
                    ways.push(vec![later(time(begin), time(last), *longer)]);
                }
                if shows(&trace[last].values)
                    && let Some(begin) = since(last + 1)
                {
                    let dues = waiting(&|net| pattern.iter().any(|entry| entry.0 == net));
                    ways.push(dues.iter().map(|due| later(time(begin), due, *longer)).collect());
                }
                ways
            }
        }
    }
}
