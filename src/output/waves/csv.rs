//! Waves as a table: one row a batch.

use crate::engine::{Change, Trace};
use crate::output::tables::write;
use crate::scenario::Scenario;

/// The batches of a trace. Within a batch nets come in net order, so a net that does not come after the one before it
/// begins a new batch, also at the same instant.
pub(super) fn batches(changes: &[Change]) -> impl Iterator<Item = &[Change]> {
    changes.chunk_by(|a, b| a.at == b.at && a.net < b.net)
}

/// Waves as CSV: header `time [ns]` (the scenario's unit) and the net names in net order; the first row is the start,
/// then one row for each batch in which something changed. Times are exact decimals, values `0`, `1`, `X`.
pub fn csv(scenario: &Scenario, trace: &Trace) -> String {
    let (circuit, unit) = (&scenario.circuit, scenario.unit);
    let mut values: Vec<char> = circuit.nets().map(|net| trace.start.get(net.index()).letter()).collect();
    write(|to| {
        let time = format!("time [{unit}]");
        to.write_record(std::iter::once(time.as_str()).chain(circuit.nets().map(|net| circuit.name(net))))?;
        let mut row = |time: String, values: &[char]| {
            let mut cells = vec![time];
            cells.extend(values.iter().map(char::to_string));
            to.write_record(&cells)
        };
        row("0".to_string(), &values)?;
        for batch in batches(&trace.changes) {
            for change in batch {
                values[change.net.index()] = change.new.letter();
            }
            row(batch[0].at.from_start().decimal(unit).to_string(), &values)?;
        }
        Ok(())
    })
}
