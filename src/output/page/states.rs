//! The delay-free view: coverage, stable states, flow map.

use maud::{Markup, html};

use super::parts::{blocks, figure};
use super::{Told, unheaded};
use crate::output::flow_map::{self, Map};
use crate::output::text::for_page;

/// The id of the map.
pub(super) const MAP: &str = "flow-map";

/// The map of a review as the page shows it.
pub(super) fn map<'a>(told: &'a Told<'_>) -> Map<'a> {
    let states = &told.review.states;
    Map { scenario: told.scenario, flow: &states.flow, state_variables: &states.state_variables, id: MAP }
}

/// Which changes the steps make, and which they do not.
pub(super) fn coverage(told: &Told<'_>) -> Markup {
    let said = unheaded(for_page::coverage(told.scenario, told.review));
    html! {
        @if said.is_empty() { p.unsure { "There is no flow table, so nothing is known of what the steps leave out." } }
        (blocks("coverage", "Coverage", &said))
    }
}

pub(super) fn section(told: &Told<'_>) -> Markup {
    html! {
        (blocks("state-set", "Stable states", &for_page::state_set(told.scenario, told.review)))
        (figure(MAP, &flow_map::svg(&map(told)), &html! {
            "Flow map: one column an input vector, one box a stable state, one arrow a change. Files: " code { "states.svg" }
            ", " code { "states.csv" } ", " code { "transitions.csv" } "."
        }))
        (blocks("dynamics", "Races, oscillations, hazards", &for_page::dynamics(told.scenario, told.review)))
    }
}
