//! Steps: where they led, and how long it took.

use maud::{Markup, html};

use super::Told;
use super::parts::{blocks, figure};
use crate::output::text::for_page;
use crate::output::{charts, convergence};

pub(super) fn section(told: &Told<'_>) -> Markup {
    let (scenario, sweep) = (told.scenario, &told.review.sweep);
    let settled = sweep.windows.iter().any(|window| window.settling.is_some());
    html! {
        (blocks("outcomes", "Outcomes of each step, with settling times", &for_page::outcomes(scenario, told.review)))
        @if settled {
            (figure("settling", &charts::settling_with(scenario, sweep, told.review.proof.as_ref()), &html! {
                "Settling times. Files: " code { "settling.svg" } ", " code { "settling.csv" } ", "
                code { "settling-figures.csv" } "."
            }))
        }
        @if sweep.stopped.is_some() {
            (figure("convergence", &convergence::svg(scenario, &told.review.asked, sweep), &html! {
                "How the shares became sure. Files: " code { "convergence.svg" } ", " code { "convergence.csv" } "."
            }))
        }
    }
}
