//! The values that a search for a limit tried, as CSV.

use super::limit_words::cause;
use super::tables::{write, yes_no};
use super::words::six;
use crate::findings::Asked;
use crate::limit::{LimitReport, MapReport, Point};
use crate::scenario::Scenario;
use crate::time::Decimal;

/// Every value that was tried, ascending, with what came of it. `share`, `low` and `high` are of failing draws; `low` and
/// `high` are empty where draws are not independent.
pub fn limit(scenario: &Scenario, asked: &Asked, report: &LimitReport) -> String {
    write(|to| {
        let head = format!("{} [{}]", report.range.parameter.words(scenario), scenario.unit);
        to.write_record([head.as_str()].into_iter().chain(COLUMNS))?;
        for point in &report.points {
            let value = Decimal::new(i128::from(point.value), scenario.unit).to_string();
            to.write_record([value].into_iter().chain(figures(scenario, asked, point)))?;
        }
        Ok(())
    })
}

/// Every pair of values, row by row from the lowest, with what came of it; pairs that were not tried are left out.
pub fn limit_map(scenario: &Scenario, asked: &Asked, report: &MapReport) -> String {
    write(|to| {
        let head = |range: &crate::limit::Range| format!("{} [{}]", range.parameter.words(scenario), scenario.unit);
        let heads = [head(&report.across.0), head(&report.up.0)];
        to.write_record(heads.iter().map(String::as_str).chain(COLUMNS))?;
        for (y, row) in report.up.1.iter().zip(&report.cells) {
            for (x, cell) in report.across.1.iter().zip(row) {
                let Some(point) = cell else { continue };
                let values = [x, y].map(|value| Decimal::new(i128::from(*value), scenario.unit).to_string());
                to.write_record(values.into_iter().chain(figures(scenario, asked, point)))?;
            }
        }
        Ok(())
    })
}

const COLUMNS: [&str; 9] = ["outcome", "draws", "failing", "at_least", "share", "low", "high", "not_judged", "because"];

fn figures(scenario: &Scenario, asked: &Asked, point: &Point) -> [String; 9] {
    let outcome = point.outcome.words().to_string();
    if let Some(why) = &point.refused {
        let empty = String::new;
        return [outcome, empty(), empty(), empty(), empty(), empty(), empty(), empty(), why.clone()];
    }
    let bound = |side: fn((f64, f64)) -> f64| {
        point.interval.map_or_else(String::new, |interval| six(side(interval)).to_string())
    };
    [
        outcome,
        point.of.to_string(),
        point.failing.to_string(),
        yes_no(point.at_least),
        six(point.share()).to_string(),
        bound(|it| it.0),
        bound(|it| it.1),
        point.not_judged.to_string(),
        point.breach.as_ref().map_or_else(String::new, |breach| cause(scenario, asked, breach)),
    ]
}
