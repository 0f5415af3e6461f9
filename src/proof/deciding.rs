//! Which inequality decides a refuted claim: candidates from the linear program of its trace, each tried by runs next to it
//! on both sides.

use super::evidence::{Demand, Least, Trail};
use super::explored::Fired;
use super::plant::{Plant, Ticks};
use super::prove::{Prover, World};
use super::race::{Race, Relation};
use super::simplex::{Program, Solved};
use super::system::{Point, Points, Sense, System};
use super::witness::case;
use crate::instance::Instance;

/// Candidates that are tried by runs, at most.
const TRIED: usize = 24;

impl Prover<'_> {
    /// The inequality that decides whether a trace is gone, as runs confirm it; `shows` says whether a run breaks the claim.
    pub(super) fn deciding(
        &self,
        world: &World,
        system: &System,
        (trace, start): (&[Fired], &[u64]),
        ties: bool,
        shows: &dyn Fn(&Instance) -> bool,
    ) -> Option<Race> {
        let trail = Trail::of(&world.plant, system);
        let fine = Fine::of(&world.plant, system)?;
        let run = |values: &[i128]| {
            let point = Point { values: values.to_vec(), denominator: 1, ties: Vec::new() };
            shows(&case(self.scenario, &fine.plant, &fine.system, &point, trace, start).instance)
        };
        let demands = trail.demands();
        if ties {
            // the first thing that must be exactly equal
            let equal = demands.iter().filter(|it| !it.strict).find(|it| demands.contains(&it.turned()))?;
            let values = fine.next_to(equal)?;
            let apart = [1, -1].iter().all(|side| moved(equal, &values, *side).iter().all(|it| !run(it)));
            return (run(&values) && apart).then(|| equal.race(&trail.quantities, Relation::Apart));
        }
        let mut candidates: Vec<Demand> = Vec::new();
        if let Least::At { factor, decides, .. } = trail.least(self.scenario)
            && factor > super::ratio::Ratio::ZERO
            && !decides.terms.is_empty()
        {
            candidates.push(decides);
        }
        // those that are nearest to being kept over the whole ranges
        let mut single: Vec<Demand> = demands.into_iter().filter(|demand| demand.strict).collect();
        single.sort_by_key(|demand| -demand.least(&trail.quantities, self.scenario));
        candidates.extend(single);
        for demand in candidates.iter().take(TRIED) {
            let Some(values) = fine.next_to(demand).filter(|values| run(values)) else { continue };
            let kept = |at: i128| {
                let tries = moved(demand, &values, at);
                !tries.is_empty() && tries.iter().all(|it| !run(it))
            };
            let relation = match (kept(0), kept(1)) {
                (true, _) => Relation::NotAbove,
                (false, true) => Relation::Below,
                (false, false) => continue,
            };
            return Some(demand.race(&trail.quantities, relation));
        }
        None
    }
}

impl Demand {
    fn value(&self, values: &[i128]) -> i128 {
        self.constant + self.terms.iter().map(|(unknown, factor)| factor * values[*unknown]).sum::<i128>()
    }

    fn turned(&self) -> Demand {
        let terms = self.terms.iter().map(|(unknown, factor)| (*unknown, -factor)).collect();
        Demand { terms, constant: -self.constant, strict: self.strict }
    }
}

/// Values in which one quantity of the demand is moved so that the demand's sum is `at`; one for each that can be.
fn moved(demand: &Demand, values: &[i128], at: i128) -> Vec<Vec<i128>> {
    let short = at - demand.value(values);
    let of = |(unknown, factor): &(usize, i128)| {
        let mut values = values.to_vec();
        values[*unknown] += short / factor;
        (short % factor == 0 && values[*unknown] >= 1).then_some(values)
    };
    demand.terms.iter().filter_map(of).collect()
}

/// A system in femtoseconds.
struct Fine {
    plant: Plant,
    system: System,
}

impl Fine {
    fn of(plant: &Plant, system: &System) -> Option<Fine> {
        let tick = i64::try_from(plant.tick).ok()?;
        let mut system = system.clone();
        for row in &mut system.rows {
            row.form.constant = row.form.constant.checked_mul(tick)?;
        }
        for range in &mut system.ranges {
            *range = Ticks { min: range.min.checked_mul(tick)?, max: range.max.checked_mul(tick)? };
        }
        let all: i128 = system.ranges.iter().map(|range| i128::from(range.max)).sum();
        let all = all + system.rows.iter().map(|row| i128::from(row.form.constant.abs())).sum::<i128>();
        (all < 1 << 60).then(|| Fine { plant: Plant { tick: 1, ..plant.clone() }, system })
    }

    /// Whole femtoseconds that meet all conditions and this demand as narrowly as can be: its sum is as near below 0 as
    /// whole femtoseconds get (at 0 if it is not strict), while all else has room.
    fn next_to(&self, demand: &Demand) -> Option<Vec<i128>> {
        let mut system = self.system.clone();
        // the conditions that make up the demand hold by 1 fs each; find how many there are by the greatest sum
        let best = self.greatest(demand)?;
        let terms: Vec<(usize, i64)> =
            demand.terms.iter().map(|(u, f)| Some((*u, i64::try_from(*f).ok()?))).collect::<Option<_>>()?;
        let constant = i64::try_from(demand.constant - best).ok()?;
        let form = super::system::Form { terms, constant };
        system.push(form, Sense::Equal);
        let Points::Some(point) = system.solve() else { return None };
        let whole = |values: &[i128]| values.iter().all(|value| value % point.denominator == 0);
        if whole(&point.values) {
            return Some(point.values.iter().map(|value| value / point.denominator).collect());
        }
        // a corner with as much room, in whole femtoseconds
        let room = |row: &super::system::Row| -> i128 {
            let sum: i128 = row.form.terms.iter().map(|(u, f)| i128::from(*f) * point.values[*u]).sum();
            -(sum + i128::from(row.form.constant) * point.denominator)
        };
        let strict = |number: &usize| system.rows[*number].sense == Sense::Below && !point.ties.contains(number);
        let least = (0..system.rows.len()).filter(strict).map(|number| room(&system.rows[number])).min();
        let least = i64::try_from(least.unwrap_or(0).div_euclid(point.denominator)).ok()?;
        corner(&system, &|number| if strict(&number) { least.max(1) } else { 0 }, &[]).and_then(
            |(values, denominator)| {
                values
                    .iter()
                    .all(|v| v % denominator == 0)
                    .then(|| values.iter().map(|value| value / denominator).collect())
            },
        )
    }

    /// The greatest value of a demand's sum while all conditions hold by whole femtoseconds.
    fn greatest(&self, demand: &Demand) -> Option<i128> {
        let goal: Vec<(usize, i64)> =
            demand.terms.iter().map(|(u, f)| Some((*u, i64::try_from(*f).ok()?))).collect::<Option<_>>()?;
        let by = |number: usize| i64::from(self.system.rows[number].sense == Sense::Below);
        let (values, denominator) = corner(&self.system, &by, &goal)?;
        let value: i128 = demand.terms.iter().map(|(unknown, factor)| factor * values[*unknown]).sum();
        Some(demand.constant + value.div_euclid(denominator))
    }
}

/// A corner of a system in which each row holds by so much, that is greatest in a direction: numerators and denominator.
fn corner(system: &System, by: &dyn Fn(usize) -> i64, goal: &[(usize, i64)]) -> Option<(Vec<i128>, i128)> {
    let mut program = Program { variables: system.unknowns.len(), ..Program::default() };
    for (number, row) in system.rows.iter().enumerate() {
        let base: i64 = row.form.terms.iter().map(|(u, factor)| factor * system.ranges[*u].min).sum();
        let limit = -row.form.constant - base - by(number);
        if row.sense == Sense::Equal {
            let other = row.form.terms.iter().map(|(unknown, factor)| (*unknown, -factor)).collect();
            program.rows.push((other, -limit));
        }
        program.rows.push((row.form.terms.clone(), limit));
    }
    for (unknown, range) in system.ranges.iter().enumerate() {
        program.rows.push((vec![(unknown, 1)], range.max - range.min));
    }
    program.objective = goal.to_vec();
    let Solved::Best(best) = program.solve() else { return None };
    let value = |(value, range): (&i128, &Ticks)| value + i128::from(range.min) * best.denominator;
    let values = best.values.iter().zip(&system.ranges).map(value).collect();
    Some((values, best.denominator))
}
