//! Directed search for the worst case, between the draws of a sweep and a proof.
//!
//! Blind draws miss what happens once in a million. From the extremes that a sweep met, the search moves the random numbers
//! of a case (never the delays themselves, so every case tried is one that a draw could give) towards where a rule has less
//! margin, by coordinate, pair and pattern moves. It finds rare failures; that it finds none says nothing: the worst it met
//! is no bound.
//!
//! Where a question has a number, its margin is the guide. `never` is guided by the time by which the parts of its pattern
//! miss each other, `before_rest` by the time from rest to the step. All others, and those too once their number helps no
//! further, are guided by how nearly some gate of their cone did something else: see `meetings.rs`.
//!
//! * `job.rs`: one question: where to start, what to follow, when to stop
//! * `bench.rs`: one case tried: run, judged, counted
//! * `descent.rs`: the moves; `firm.rs`: is it more than a tie?
//! * `meetings.rs`, `apart.rs`: the guides; `heard.rs`: what judges say of a run
//!
//! Source of the moves: R. Hooke, T. A. Jeeves, "'Direct search' solution of numerical and statistical problems", J. ACM 8
//! (1961) 212-229 (from memory).

mod apart;
mod bench;
mod descent;
mod firm;
mod heard;
mod job;
mod meetings;
mod report;

use std::sync::Mutex;
use std::sync::atomic::{AtomicU64, AtomicUsize, Ordering};

use bench::Shared;
pub use report::{Breach, Ended, Guidance, SearchReport, Searched};

use crate::control::Control;
use crate::engine::Program;
use crate::findings::{Asked, RuleKey};
use crate::instance::{Cases, Numbers};
use crate::scenario::{Plan, Scenario};
use crate::sweep::SweepReport;

/// All questions together get this many times the runs of one.
const QUESTIONS: u64 = 20;
/// Runs below which a question is rather left out than searched.
const LEAST: u64 = Plan::LEAST_SEARCH;

/// Something met on the way that breaks another question than the one that was searched.
struct Stray {
    question: u32,
    numbers: Numbers,
}

/// Searches for the worst case of every question that no draw of this sweep broke, on this many threads (0: all cores).
///
/// A question gets at most `plan.search` runs, all together at most 20 times as many; what is left out for that is named.
/// The result depends on nothing but scenario and sweep. If the control cancels, what was found by then is given back and
/// says so. With `plan.search` 0 nothing is searched.
pub fn search(
    scenario: &Scenario,
    program: &Program,
    asked: &Asked,
    sweep: &SweepReport,
    threads: usize,
    control: &Control,
) -> SearchReport {
    let per_question = scenario.plan.search;
    let total = per_question.saturating_mul(QUESTIONS);
    let mut searched: Vec<Searched> =
        sweep.rules.iter().enumerate().map(|(q, rule)| Searched::unsearched(q as u32, rule)).collect();
    let varies = Cases::has_rest(scenario) || Cases::new(scenario).all(0).count() > 0;
    let mut open: Vec<usize> = Vec::new();
    for (q, it) in searched.iter_mut().enumerate() {
        let rule = &sweep.rules[q];
        let at_start = rule.question.rule == RuleKey::NeverAtRest && rule.question.moment.is_none();
        it.ended = if per_question == 0 {
            Ended::Off
        } else if rule.broken > 0 {
            Ended::BrokenInDraws
        } else if !varies || at_start {
            Ended::NothingVaries
        } else {
            open.push(q);
            Ended::NoBudget
        };
    }
    // the nearest to being broken first, of those without a number the written ones first
    let nearness = |q: &usize| {
        let rule = &sweep.rules[*q];
        let bound = rule.question.bound.map_or(1, |bound| i128::from(bound.fs()).max(1));
        let share = rule.margin.map_or(i128::MAX, |margin| margin.saturating_mul(1_000_000) / bound);
        (share, !rule.question.written, *q)
    };
    open.sort_by_key(nearness);
    let most = usize::try_from(total / LEAST).unwrap_or(usize::MAX);
    open.truncate(most.max(usize::from(per_question > 0)));
    let budget = per_question.min(total / (open.len() as u64).max(1));

    let shared = Shared { scenario, program, asked, sweep, control, budget };
    let (next, done) = (AtomicUsize::new(0), AtomicU64::new(0));
    let planned = sweep.samples + budget * open.len() as u64;
    let results = Mutex::new(Vec::new());
    let work = || {
        while let Some(q) = open.get(next.fetch_add(1, Ordering::Relaxed)) {
            let result = job::search_one(&shared, *q as u32);
            control.report(sweep.samples + done.fetch_add(budget, Ordering::Relaxed) + budget, planned);
            results.lock().unwrap_or_else(std::sync::PoisonError::into_inner).push(result);
        }
    };
    let threads = match threads {
        0 => std::thread::available_parallelism().map_or(1, usize::from),
        n => n,
    };
    let threads = threads.min(open.len());
    if threads <= 1 {
        work();
    } else {
        std::thread::scope(|scope| {
            for _ in 0..threads {
                scope.spawn(work);
            }
        });
    }
    let mut strays: Vec<(u32, Stray)> = Vec::new();
    for (result, met) in results.into_inner().unwrap_or_else(std::sync::PoisonError::into_inner) {
        let by = result.question;
        strays.extend(met.into_iter().map(|stray| (by, stray)));
        searched[by as usize] = result;
    }
    // what another question's search met; of several the one of the lowest question
    strays.sort_by_key(|(by, stray)| (stray.question, *by));
    strays.dedup_by_key(|(_, stray)| stray.question);
    for (_, stray) in &strays {
        let it = &mut searched[stray.question as usize];
        if it.breach.is_none() && !control.cancelled() {
            job::adopt(&shared, it, &stray.numbers);
        }
    }
    let runs = searched.iter().map(|it| it.runs).sum();
    let interrupted = searched.iter().any(|it| it.ended == Ended::Interrupted);
    SearchReport { per_question, budget, runs, searched, interrupted }
}
