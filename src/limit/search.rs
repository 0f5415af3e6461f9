//! The search: a coarse scan of the range, then bisection wherever it changes from passing to not passing.

use std::collections::BTreeMap;

use super::report::{Beyond, Boundary, LimitReport, MapReport, Point, Range, Stretch};
use super::trial::{Stop, Trials};
use super::variant::{legal, middle, shown, variant};
use super::{LimitError, Parameter, Search};
use crate::control::Control;
use crate::scenario::Scenario;

/// Boundaries that are followed, at most.
const MOST_BOUNDARIES: usize = 16;
/// The default range reaches to this many times the longest settling time.
const SETTLINGS: i64 = 4;
/// The default resolution, as a part of the range, where draws differ.
const PART: u64 = 1000;

/// Finds how far a parameter may go with all rules passing: the passing end of the boundary that is nearest to the easy
/// end of the range (short for skew, long for all else), with every other change of passing and not passing.
///
/// Every value is swept with the same samples (numbers of draws) on this many threads (0: all cores); the result does not
/// depend on threads. First the values of an even grid are tried, then each boundary between neighbours is bisected, at
/// most 16 of them. If the control cancels, it holds the values that were complete by then.
///
/// Errors: the range is empty or no value of it is possible, the circuit has no state to begin in, the program contradicts
/// itself, or the control cancelled it before the easy end was known.
pub fn limit(
    scenario: &Scenario,
    search: &Search,
    threads: usize,
    control: &Control,
) -> Result<LimitReport, LimitError> {
    let mut trials = Trials::new(scenario, threads, control)?;
    let longest = longest_settling(&trials, std::slice::from_ref(search))?;
    let range = range(scenario, search, search.parameter.own(scenario), longest)?;
    let parameter = search.parameter;
    let ends = [range.legal.from, range.legal.to];
    let alike = ends.iter().all(|end| trials.are_alike(&[(parameter, *end)]));
    if alike {
        trials.samples = 1;
    }
    let length = range.legal.to.abs_diff(range.legal.from);
    let within = search.within.unwrap_or(if alike { 1 } else { round_down(length / PART) }).max(1);
    stopped(trials.measure_by(&[(parameter, range.easy_end())]))?;

    let values = grid(range.legal.from, range.legal.to, search.points);
    let scan = values.windows(2).map(|pair| pair[0].abs_diff(pair[1])).max().unwrap_or(0);
    let mut walk = Walk { trials: &trials, parameter, points: BTreeMap::new(), planned: values.len() as u64 };
    // the easy end first, so that a stopped search knows most of what matters
    let mut from_easy: Vec<i64> = values.clone();
    if range.easy_end() == range.legal.to {
        from_easy.reverse();
    }
    let mut interrupted = false;
    let mut not_followed = 0;
    let done = from_easy.iter().try_for_each(|value| walk.at(*value).map(|_| ()));
    let done = done.and_then(|()| {
        let mut boundaries = walk.boundaries();
        if range.easy_end() == range.legal.to {
            boundaries.reverse();
        }
        not_followed = boundaries.len().saturating_sub(MOST_BOUNDARIES);
        boundaries.truncate(MOST_BOUNDARIES);
        walk.planned += boundaries.len() as u64 * u64::from(steps(scan, within));
        boundaries.into_iter().try_for_each(|boundary| walk.follow(boundary, within))
    });
    match done {
        Ok(()) => {}
        Err(Stop::Cancelled) => interrupted = true,
        Err(Stop::Failed(error)) => return Err(error),
    }
    let points: Vec<Point> = walk.points.into_values().collect();
    if points.is_empty() {
        return Err(LimitError::Cancelled);
    }
    let mut report = LimitReport {
        stretches: stretches(&points),
        boundaries: boundaries(&points),
        points,
        within,
        samples: trials.samples,
        alike,
        scan,
        not_followed,
        limit: None,
        beyond: None,
        open: trials.open(),
        interrupted,
        range,
    };
    if report.easy_end_passes() {
        let nearest_last = report.range.easy_end() == report.range.legal.to;
        let boundary = if nearest_last { report.boundaries.last() } else { report.boundaries.first() };
        report.limit = boundary.copied();
    }
    let beyond = match report.limit {
        Some(limit) => Some(limit.fails),
        None if !report.easy_end_passes() => Some(report.range.easy_end()),
        None => None,
    };
    report.beyond = match beyond.and_then(|value| report.points.iter().find(|point| point.value == value)) {
        Some(point) => Some(beyond_of(&trials, parameter, point)?),
        None => None,
    };
    Ok(report)
}

fn beyond_of(trials: &Trials<'_>, parameter: Parameter, point: &Point) -> Result<Beyond, LimitError> {
    let case = match &point.breach {
        Some(breach) => trials.case_of(&[(parameter, point.value)], breach)?,
        None => None,
    };
    Ok(Beyond { point: point.clone(), case })
}

/// Tries every pair of values of two parameters on an even grid, the second with the first already set.
///
/// As [`limit`], but nothing is bisected. The easy corner (both parameters at their easy ends) says what is asked of all
/// other pairs.
pub fn map(
    scenario: &Scenario,
    across: &Search,
    up: &Search,
    threads: usize,
    control: &Control,
) -> Result<MapReport, LimitError> {
    if across.parameter == up.parameter {
        return Err(LimitError::Bad("both parameters are the same one; name two, or leave the second out".to_string()));
    }
    let mut trials = Trials::new(scenario, threads, control)?;
    let longest = longest_settling(&trials, &[*across, *up])?;
    let range_across = range(scenario, across, across.parameter.own(scenario), longest)?;
    let range_up = range(scenario, up, up.parameter.own(scenario), longest)?;
    let (a, b) = (across.parameter, up.parameter);
    let corners = [&range_across, &range_up].map(|range| [range.legal.from, range.legal.to]);
    let alike = corners[0].iter().all(|x| corners[1].iter().all(|y| trials.are_alike(&[(a, *x), (b, *y)])));
    if alike {
        trials.samples = 1;
    }
    let easy = [(a, range_across.easy_end()), (b, range_up.easy_end())];
    if let Err(why) = variant(scenario, &easy) {
        let (x, y) = (shown(easy[0].1, scenario), shown(easy[1].1, scenario));
        return Err(LimitError::Bad(format!("{x} and {y} together are not possible: {why}")));
    }
    stopped(trials.measure_by(&easy))?;
    let xs = grid(range_across.legal.from, range_across.legal.to, across.points);
    let ys = grid(range_up.legal.from, range_up.legal.to, up.points);
    let total = (xs.len() * ys.len()) as u64;
    let mut cells = vec![vec![None; xs.len()]; ys.len()];
    let mut done = 0;
    'all: for (row, y) in cells.iter_mut().zip(&ys) {
        for (cell, x) in row.iter_mut().zip(&xs) {
            match trials.at(&[(a, *x), (b, *y)]) {
                Ok(point) => *cell = Some(point),
                Err(Stop::Cancelled) => break 'all,
                Err(Stop::Failed(error)) => return Err(error),
            }
            done += 1;
            control.report(done, total);
        }
    }
    if done == 0 {
        return Err(LimitError::Cancelled);
    }
    let open = trials.open();
    Ok(MapReport { across: (range_across, xs), up: (range_up, ys), samples: trials.samples, alike, cells, open })
}

/// The longest settling time of the scenario as it is, if a range has to be chosen from it.
fn longest_settling(trials: &Trials<'_>, searches: &[Search]) -> Result<Option<i64>, LimitError> {
    if searches.iter().all(|search| search.from.is_some() && search.to.is_some()) {
        return Ok(None);
    }
    let report = stopped(trials.as_it_is())?;
    let longest = report.windows.iter().filter_map(|window| window.settling.as_ref()).map(|it| it.max).max();
    Ok(longest.and_then(|span| i64::try_from(span.fs()).ok()))
}

fn stopped<T>(result: Result<T, Stop>) -> Result<T, LimitError> {
    result.map_err(|stop| match stop {
        Stop::Cancelled => LimitError::Cancelled,
        Stop::Failed(error) => error,
    })
}

/// The range to search: as given, else from 0 (or as far on the other side) to four times the longest settling time or
/// the scenario's own value, whichever is longer.
fn range(scenario: &Scenario, search: &Search, own: Option<i64>, longest: Option<i64>) -> Result<Range, LimitError> {
    let parameter = search.parameter;
    let settling = longest.unwrap_or(0).saturating_mul(SETTLINGS);
    let far = settling.max(own.unwrap_or(0));
    let from = search.from.unwrap_or(if parameter.is_signed() { -settling } else { 0 });
    let to = match search.to {
        Some(to) => to,
        None if far > from => far,
        None => {
            let message = "nothing in the scenario says how far to search; give `--to`".to_string();
            return Err(LimitError::Bad(message));
        }
    };
    let words = parameter.words(scenario);
    let (low, high) = (shown(from, scenario), shown(to, scenario));
    if from >= to {
        let what = if from == to { "empty" } else { "reversed" };
        return Err(LimitError::Bad(format!(
            "{words}: the range from {low} to {high} is {what}; write the smaller first"
        )));
    }
    let why_not = |value: i64| variant(scenario, &[(parameter, value)]).err();
    let tried = grid(from, to, search.points.max(65)).into_iter();
    let legal = legal((from, to), tried, why_not)
        .map_err(|why| LimitError::Bad(format!("{words}: no value from {low} to {high} is possible: {why}")))?;
    if legal.from == legal.to {
        let only = shown(legal.from, scenario);
        let why = legal.below.or(legal.above).unwrap_or_default();
        return Err(LimitError::Bad(format!("{words}: only {only} is possible from {low} to {high}: {why}")));
    }
    let given = search.from.is_some() && search.to.is_some();
    Ok(Range { parameter, asked: (from, to), legal, given })
}

/// Even values from one end to the other, both included; all whole numbers if there are not more.
fn grid(from: i64, to: i64, points: u32) -> Vec<i64> {
    let length = i128::from(to) - i128::from(from);
    let parts = i128::from(points.max(2) - 1).min(length.max(1));
    let mut values: Vec<i64> = (0..=parts).map(|k| (i128::from(from) + length * k / parts) as i64).collect();
    values.dedup();
    values
}

/// The greatest of 1, 2, 5, 10, … that is not above; 1 at least.
fn round_down(most: u64) -> u64 {
    let power = 10u64.pow(most.max(1).ilog10());
    [5, 2, 1].into_iter().map(|digit| digit * power).find(|it| *it <= most).unwrap_or(1)
}

/// Steps that a bisection takes.
fn steps(from: u64, within: u64) -> u32 {
    from.div_ceil(within.max(1)).max(1).next_power_of_two().ilog2()
}

struct Walk<'a, 'b> {
    trials: &'a Trials<'b>,
    parameter: Parameter,
    points: BTreeMap<i64, Point>,
    planned: u64,
}

impl Walk<'_, '_> {
    fn at(&mut self, value: i64) -> Result<bool, Stop> {
        if let Some(point) = self.points.get(&value) {
            return Ok(point.passes());
        }
        let point = self.trials.at(&[(self.parameter, value)])?;
        let passes = point.passes();
        self.points.insert(value, point);
        let done = self.points.len() as u64;
        self.trials.control.report(done, self.planned.max(done));
        Ok(passes)
    }

    fn boundaries(&self) -> Vec<Boundary> {
        let points: Vec<Point> = self.points.values().cloned().collect();
        boundaries(&points)
    }

    /// Halves the way between a value that passes and one that does not.
    fn follow(&mut self, boundary: Boundary, within: u64) -> Result<(), Stop> {
        let Boundary { mut passes, mut fails } = boundary;
        while passes.abs_diff(fails) > within {
            let value = middle(passes, fails);
            match self.at(value)? {
                true => passes = value,
                false => fails = value,
            }
        }
        Ok(())
    }
}

/// Neighbours of which one passes and the other does not.
fn boundaries(points: &[Point]) -> Vec<Boundary> {
    let pairs = points.windows(2).filter(|pair| pair[0].passes() != pair[1].passes());
    let boundary = |pair: &[Point]| match pair[0].passes() {
        true => Boundary { passes: pair[0].value, fails: pair[1].value },
        false => Boundary { passes: pair[1].value, fails: pair[0].value },
    };
    pairs.map(boundary).collect()
}

/// Neighbours that are alike, put together.
fn stretches(points: &[Point]) -> Vec<Stretch> {
    let mut stretches: Vec<Stretch> = Vec::new();
    for point in points {
        match stretches.last_mut() {
            Some(last) if last.passes == point.passes() => last.to = point.value,
            _ => stretches.push(Stretch { from: point.value, to: point.value, passes: point.passes() }),
        }
    }
    stretches
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_grid_has_both_ends_and_no_value_twice() {
        assert_eq!(grid(0, 10, 3), [0, 5, 10]);
        assert_eq!(grid(-1, 2, 33), [-1, 0, 1, 2]);
        assert_eq!(grid(i64::MIN, i64::MAX, 2), [i64::MIN, i64::MAX]);
        assert_eq!(grid(0, 1_000_000_007, 33).len(), 33);
    }

    #[test]
    fn resolutions_are_round() {
        assert_eq!([0, 1, 3, 49, 50, 999].map(round_down), [1, 1, 2, 20, 50, 500]);
        assert_eq!((steps(1000, 1), steps(1, 1), steps(0, 1)), (10, 0, 0));
    }
}
