//! What a trace demands of delays, in terms of the scenario and not of one exploration.

use super::explored::Fired;
use super::goals::Goal;
use super::plant::Plant;
use super::prove::World;
use super::race::{Quantity, Race, Relation, Sum};
use super::ratio::{Ratio, common};
use super::simplex::{Program, Solved};
use super::system::{Row, Sense, System, Unknown};
use crate::delay::DelayRange;
use crate::scenario::Scenario;

/// A sum of the quantities of a trace, in femtoseconds, that the trace demands to be below 0 (or, if not strict, at most 0).
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Demand {
    /// Quantities by their number in the [`Trail`], with factors.
    pub terms: Vec<(usize, i128)>,
    pub constant: i128,
    pub strict: bool,
}

/// The conditions of one trace.
#[derive(Clone, Debug)]
pub(super) struct Trail {
    pub quantities: Vec<Quantity>,
    rows: Vec<Row>,
    /// Femtoseconds of one unit of the constants of the rows.
    tick: i128,
}

/// What refutes a claim: traces that must all be possible.
#[derive(Clone, Debug)]
pub(super) struct Evidence {
    pub question: u32,
    pub trails: Vec<Trail>,
}

/// The least factor of all ranges at which a trace is possible.
pub(super) enum Least {
    /// This one, with what decides there, and the change of the factor that surely matters to whole femtoseconds.
    At { factor: Ratio, decides: Demand, step: Option<Ratio> },
    /// It never is.
    Never,
    /// The numbers grew too large.
    GaveUp,
}

/// The quantities of the unknowns of a system.
pub(super) fn quantities(plant: &Plant, system: &System) -> Vec<Quantity> {
    let of = |(unknown, edges): (&Unknown, &[bool; 2])| match *unknown {
        Unknown::Gate(gate, _) => Quantity::Gate(plant.gates[gate as usize].gate, *edges),
        Unknown::Wire(wire, _) => Quantity::Wire(plant.wires[wire as usize].wire, *edges),
        Unknown::Place(step) => Quantity::Place(step),
        Unknown::First(clock) => Quantity::First(plant.clocks[clock as usize].clock),
        Unknown::Period(clock) => Quantity::Period(plant.clocks[clock as usize].clock),
        Unknown::High(clock) => Quantity::High(plant.clocks[clock as usize].clock),
        Unknown::Jitter(clock, edge) => Quantity::Jitter(plant.clocks[clock as usize].clock, edge),
        Unknown::Toggle { step, entry, number, last } => {
            let (net, _) = plant.steps[step as usize].set[entry as usize];
            Quantity::Toggle { step, net: plant.nets[net as usize], number, last }
        }
        Unknown::Late(step, entry) => {
            let (net, _) = plant.steps[step as usize].set[entry as usize];
            Quantity::Late(step, plant.nets[net as usize])
        }
    };
    system.unknowns.iter().zip(&system.edges).map(of).collect()
}

/// The trails of a trace to a goal, each firing with a delay of its own; one for each way to reach it.
pub(super) fn trails(world: &World, trace: &[Fired], start: &[u64], goal: &Goal) -> Vec<Trail> {
    let system = System::of_each(&world.plant, start, trace);
    let ways = goal.ways(&world.plant, &system, start, trace);
    let trail = |forms: Vec<super::system::Form>| {
        let mut system = system.clone();
        forms.into_iter().for_each(|form| system.push(form, Sense::Below));
        Trail::of(&world.plant, &system)
    };
    ways.into_iter().map(trail).collect()
}

impl Trail {
    pub fn of(plant: &Plant, system: &System) -> Trail {
        Trail { quantities: quantities(plant, system), rows: system.rows.clone(), tick: i128::from(plant.tick) }
    }

    /// The rows as demands; an equality demands two.
    pub fn demands(&self) -> Vec<Demand> {
        let mut all = Vec::new();
        for row in self.rows.iter().filter(|row| !row.form.terms.is_empty()) {
            let terms: Vec<(usize, i128)> = row.form.terms.iter().map(|(u, f)| (*u, i128::from(*f))).collect();
            let constant = i128::from(row.form.constant) * self.tick;
            if row.sense == Sense::Equal {
                let other = terms.iter().map(|(unknown, factor)| (*unknown, -factor)).collect();
                all.push(Demand { terms: other, constant: -constant, strict: false });
            }
            all.push(Demand { terms, constant, strict: row.sense == Sense::Below });
        }
        all
    }

    /// The rows with these prices added up (two prices for an equality, the second for its other side).
    fn priced(&self, price: impl Fn(usize) -> i128) -> Demand {
        let mut sum = Demand { terms: Vec::new(), constant: 0, strict: false };
        let mut factors = vec![0i128; self.quantities.len()];
        for (number, row) in self.rows.iter().enumerate() {
            let price = price(number);
            if price == 0 {
                continue;
            }
            row.form.terms.iter().for_each(|(unknown, factor)| factors[*unknown] += price * i128::from(*factor));
            sum.constant += price * i128::from(row.form.constant) * self.tick;
            sum.strict |= row.sense == Sense::Below;
        }
        sum.terms = factors.into_iter().enumerate().filter(|(_, factor)| *factor != 0).collect();
        let divisor = sum.terms.iter().fold(sum.constant, |divisor, term| common(divisor, term.1)).max(1);
        sum.terms.iter_mut().for_each(|term| term.1 /= divisor);
        sum.constant /= divisor;
        sum
    }

    /// The rows over variables from `lows` on, in units of `unit` femtoseconds, and for each row of the program the row it
    /// stands for and its sign.
    fn program(&self, lows: &[i128], unit: i128, more: usize) -> Option<(Program, Vec<(usize, i128)>)> {
        let mut program = Program { variables: self.quantities.len() + more, ..Program::default() };
        let mut from = Vec::new();
        for (number, row) in self.rows.iter().enumerate() {
            let base: i128 = row.form.terms.iter().map(|(u, factor)| i128::from(*factor) * lows[*u]).sum();
            let limit = i64::try_from((-i128::from(row.form.constant) * self.tick - base) / unit).ok()?;
            program.rows.push((row.form.terms.clone(), limit));
            from.push((number, 1));
            if row.sense == Sense::Equal {
                let other = row.form.terms.iter().map(|(unknown, factor)| (*unknown, -factor)).collect();
                program.rows.push((other, -limit));
                from.push((number, -1));
            }
        }
        Some((program, from))
    }

    /// The greatest unit in which all times here are whole.
    fn unit(&self, ranges: &[DelayRange]) -> i128 {
        let rows = self.rows.iter().fold(0, |unit, row| common(unit, i128::from(row.form.constant) * self.tick));
        let all = ranges.iter().flat_map(|range| [range.min, range.typ, range.max]);
        all.fold(rows, |unit, span| common(unit, i128::from(span.fs()))).max(1)
    }

    fn ranges(&self, scenario: &Scenario) -> Vec<DelayRange> {
        self.quantities.iter().map(|quantity| quantity.range(scenario)).collect()
    }

    /// The least factor by which ranges are stretched about typical at which this trace is possible, or all but: one linear
    /// program with the factor as a variable. Delays do not go below the unit in which all times here are whole, times of
    /// the surroundings are not stretched.
    pub fn least(&self, scenario: &Scenario) -> Least {
        self.least_of(scenario).unwrap_or(Least::GaveUp)
    }

    fn least_of(&self, scenario: &Scenario) -> Option<Least> {
        let ranges = self.ranges(scenario);
        let unit = self.unit(&ranges);
        // a delay of all but 0 is as good as 0 here: nearer than a whole unit nothing lies
        let low = |(quantity, range): (&Quantity, &DelayRange)| match quantity.is_delay() {
            true => 0,
            false => i128::from(range.min.fs()),
        };
        let lows: Vec<i128> = self.quantities.iter().zip(&ranges).map(low).collect();
        let (mut program, from) = self.program(&lows, unit, 1)?;
        let factor = self.quantities.len();
        let whole = |fs: u64| i64::try_from(i128::from(fs) / unit).ok();
        for (unknown, (quantity, range)) in self.quantities.iter().zip(&ranges).enumerate() {
            let (down, up) = ((range.typ - range.min).fs(), (range.max - range.typ).fs());
            if quantity.is_delay() {
                let typ = whole(range.typ.fs())?;
                program.rows.push((vec![(unknown, 1), (factor, -whole(up)?)], typ));
                program.rows.push((vec![(unknown, -1), (factor, -whole(down)?)], -typ));
            } else {
                program.rows.push((vec![(unknown, 1)], whole((range.max - range.min).fs())?));
            }
        }
        program.rows.iter_mut().for_each(|row| row.0.retain(|term| term.1 != 0));
        program.objective.push((factor, -1));
        let best = match program.solve() {
            Solved::Best(best) => best,
            Solved::Infeasible => return Some(Least::Never),
            Solved::Unbounded | Solved::GaveUp => return None,
        };
        let factor = Ratio::new(best.values[factor], best.denominator)?;
        let price = |number: usize| {
            let of = from.iter().zip(&best.prices).filter(|((row, _), _)| *row == number);
            of.map(|((_, sign), price)| sign * price).sum()
        };
        let decides = self.priced(price);
        // a change of the factor that moves what decides by more than rounding does
        let moved = |(unknown, times): &(usize, i128)| {
            let range = ranges[*unknown];
            let width = if *times < 0 { range.max - range.typ } else { range.typ - range.min };
            if self.quantities[*unknown].is_delay() { times.abs() * i128::from(width.fs()) } else { 0 }
        };
        let moved: i128 = decides.terms.iter().map(moved).sum();
        let rounded: i128 = decides.terms.iter().map(|term| term.1.abs()).sum();
        let step = Ratio::new(2 * (rounded + 2), moved);
        Some(Least::At { factor, decides, step })
    }

    /// What holds this trace closest: the conditions that bound its greatest slack over the ranges, added up.
    pub fn closest(&self, scenario: &Scenario) -> Option<Demand> {
        let ranges = self.ranges(scenario);
        let unit = self.unit(&ranges);
        let lows: Vec<i128> = ranges.iter().map(|range| i128::from(range.min.fs())).collect();
        let (mut program, from) = self.program(&lows, unit, 2)?;
        let slack = self.quantities.len();
        for (row, (number, _)) in program.rows.iter_mut().zip(&from) {
            // the slack may be below 0, so that there always is a point
            row.0.push((slack + 1, -1));
            if self.rows[*number].sense == Sense::Below {
                row.0.push((slack, 1));
            }
        }
        for (unknown, range) in ranges.iter().enumerate() {
            let width = i64::try_from(i128::from((range.max - range.min).fs()) / unit).ok()?;
            program.rows.push((vec![(unknown, 1)], width));
        }
        program.rows.push((vec![(slack, 1)], 1 << 40));
        program.objective = vec![(slack, 1), (slack + 1, -2)];
        let Solved::Best(best) = program.solve() else { return None };
        let price = |number: usize| {
            let of = from.iter().zip(&best.prices).filter(|((row, _), _)| *row == number);
            of.map(|((_, sign), price)| sign * price).sum()
        };
        let demand = self.priced(price);
        (!demand.terms.is_empty()).then_some(demand)
    }
}

impl Demand {
    /// Its least value over the ranges of a scenario, in femtoseconds: while that is not below 0, nothing meets it.
    pub fn least(&self, quantities: &[Quantity], scenario: &Scenario) -> i128 {
        let extreme = |(unknown, factor): &(usize, i128)| {
            let range = quantities[*unknown].range(scenario);
            factor * i128::from(if *factor > 0 { range.min.fs() } else { range.max.fs() })
        };
        self.constant + self.terms.iter().map(extreme).sum::<i128>()
    }

    /// As the two sums that must stand so for it not to be met.
    pub fn race(&self, quantities: &[Quantity], relation: Relation) -> Race {
        let mut race = Race { first: Sum::default(), relation, second: Sum::default() };
        for (unknown, factor) in &self.terms {
            let sum = if *factor < 0 { &mut race.first } else { &mut race.second };
            let quantity = quantities[*unknown];
            match sum.terms.iter_mut().find(|term| term.0 == quantity) {
                Some(term) => term.1 += factor.unsigned_abs() as u64,
                None => sum.terms.push((quantity, factor.unsigned_abs() as u64)),
            }
        }
        let sum = if self.constant < 0 { &mut race.first } else { &mut race.second };
        sum.constant = self.constant.unsigned_abs();
        race
    }
}
