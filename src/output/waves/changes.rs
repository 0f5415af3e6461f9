//! Waves as a table with one row a transition: of any length, written while the run goes on.

use std::io::{self, Write};

use crate::circuit::NetId;
use crate::engine::Observer;
use crate::logic::{State, Value};
use crate::scenario::Scenario;
use crate::time::Time;

/// Writes the transitions of a run as CSV, in memory that does not grow with the run.
///
/// Header `time [ns],net,value` (the scenario's unit); then the start, one row a net in net order at time 0; then one row a
/// transition in the order in which they came. Times are exact decimals, values `0`, `1`, `X`. At one instant there may
/// be several rows of one net: each is a transition.
pub struct Changes<'a, W> {
    scenario: &'a Scenario,
    to: W,
    /// The last instant and its text: most instants have several rows.
    at: (Time, String),
    rows: u64,
    /// The first error: after it nothing is written.
    error: Option<io::Error>,
}

impl<'a, W: Write> Changes<'a, W> {
    /// A table on this device, with its header and the start. Buffer the device if it is slow.
    pub fn new(scenario: &'a Scenario, start: &State, to: W) -> Changes<'a, W> {
        let mut table = Changes { scenario, to, at: (Time::ZERO, "0".to_string()), rows: 0, error: None };
        table.note(|to| writeln!(to, "time [{}],net,value", scenario.unit));
        for net in scenario.circuit.nets() {
            table.row(Time::ZERO, net, start.get(net.index()));
        }
        table.rows = 0;
        table
    }

    /// Writes one transition.
    pub fn row(&mut self, at: Time, net: NetId, new: Value) {
        if at != self.at.0 {
            self.at = (at, at.from_start().decimal(self.scenario.unit).to_string());
        }
        self.rows += 1;
        let (time, name) = (std::mem::take(&mut self.at.1), self.scenario.circuit.name(net));
        // net names are letters, digits, `_`, `.`, `[` and `]`: no field needs quotes
        self.note(|to| writeln!(to, "{time},{name},{}", new.letter()));
        self.at.1 = time;
    }

    /// Transitions written so far.
    pub fn rows(&self) -> u64 {
        self.rows
    }

    /// Has writing failed? Then nothing more is written, and [`Changes::finish`] says why.
    pub fn failed(&self) -> bool {
        self.error.is_some()
    }

    /// Ends the table and gives the device back.
    ///
    /// Errors: the first that the device gave.
    pub fn finish(mut self) -> io::Result<W> {
        self.note(Write::flush);
        match self.error {
            None => Ok(self.to),
            Some(error) => Err(error),
        }
    }

    fn note(&mut self, write: impl FnOnce(&mut W) -> io::Result<()>) {
        if self.error.is_none() {
            self.error = write(&mut self.to).err();
        }
    }
}

/// Keeps the transitions of a run up to a number, and opens a table for all of them when there are more.
pub struct Overflow<'a, W, F> {
    scenario: &'a Scenario,
    most: usize,
    start: State,
    kept: Vec<(Time, NetId, Value)>,
    open: F,
    table: Option<Changes<'a, W>>,
    /// Why the table could not be opened.
    error: Option<io::Error>,
    /// Called once when nothing more can be written: there is no reason to run on.
    give_up: &'a dyn Fn(),
    gave_up: bool,
}

impl<'a, W: Write, F: FnMut() -> io::Result<W>> Overflow<'a, W, F> {
    /// Keeps up to `most` transitions; `open` is called once, if there are more. `give_up` is called once if the table
    /// cannot be opened or written.
    pub fn new(scenario: &'a Scenario, most: usize, open: F, give_up: &'a dyn Fn()) -> Overflow<'a, W, F> {
        let (start, kept) = (State::default(), Vec::new());
        Overflow { scenario, most, start, kept, open, table: None, error: None, give_up, gave_up: false }
    }

    /// Opens the table, if it is not, and writes what was kept.
    fn spill(&mut self) {
        if self.table.is_some() || self.error.is_some() {
            return;
        }
        match (self.open)() {
            Ok(to) => {
                let mut table = Changes::new(self.scenario, &self.start, to);
                std::mem::take(&mut self.kept).into_iter().for_each(|(at, net, new)| table.row(at, net, new));
                self.table = Some(table);
            }
            Err(error) => {
                self.error = Some(error);
                (self.give_up)();
            }
        }
    }

    /// Ends the run: the table's device and its number of transitions; `None` if there were not more than `most`. With
    /// `anyway` the table is written however few there are.
    ///
    /// Errors: the table could not be opened or written.
    pub fn finish(mut self, anyway: bool) -> io::Result<Option<(W, u64)>> {
        if anyway {
            self.spill();
        }
        match (self.error, self.table) {
            (Some(error), _) => Err(error),
            (None, None) => Ok(None),
            (None, Some(table)) => {
                let rows = table.rows();
                Ok(Some((table.finish()?, rows)))
            }
        }
    }
}

impl<W: Write, F: FnMut() -> io::Result<W>> Observer for Overflow<'_, W, F> {
    type Tag = ();

    fn start(&mut self, state: &State) {
        self.start = state.clone();
    }

    fn change(&mut self, at: Time, net: NetId, new: Value, _cause: ()) {
        if self.table.is_none() && self.kept.len() < self.most {
            self.kept.push((at, net, new));
            return;
        }
        self.spill();
        if let Some(table) = &mut self.table {
            table.row(at, net, new);
            if table.failed() && !std::mem::replace(&mut self.gave_up, true) {
                (self.give_up)();
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;

    use super::*;
    use crate::circuit::Function;
    use crate::control::Control;
    use crate::engine::{Program, Trace};
    use crate::instance::{Instance, Which};
    use crate::scenario::{Builder, NewStep};

    fn latch() -> Scenario {
        let mut b = Builder::new("latch");
        b.input("s", true);
        b.input("r", true);
        b.gate("q", Function::Nand, ["s", "qn"]).delay("2.5");
        b.gate("qn", Function::Nand, ["r", "q"]).delay("2.5");
        b.initial("q", false);
        for (at, net, value) in [("10", "s", false), ("20", "s", true), ("30", "r", false), ("40", "r", true)] {
            b.step(NewStep::at(at).set(net, value));
        }
        b.finish().unwrap()
    }

    fn table(most: usize, anyway: bool) -> Option<(String, u64)> {
        let scenario = latch();
        let mut table = Overflow::new(&scenario, most, || Ok(Vec::new()), &|| panic!("memory takes every byte"));
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let instance = Instance::of(&scenario, &Which::Typ);
        assert!(program.machine().run(&instance, &Control::default(), &mut table));
        let (bytes, rows) = table.finish(anyway).unwrap()?;
        Some((String::from_utf8(bytes).unwrap(), rows))
    }

    #[test]
    fn every_transition_has_a_row_from_whatever_number_on_it_is_written() {
        let all = "time [ns],net,value\n0,s,1\n0,r,1\n0,q,0\n0,qn,1\n10,s,0\n12.5,q,1\n15,qn,0\n20,s,1\n30,r,0\n\
                   32.5,qn,1\n35,q,0\n40,r,1\n";
        for most in 0..8 {
            assert_eq!(table(most, false), Some((all.to_string(), 8)), "more than {most}");
        }
        assert_eq!(table(8, false), None);
        assert_eq!(table(8, true), Some((all.to_string(), 8)));
    }

    #[test]
    fn the_rows_are_the_transitions_of_the_trace() {
        let scenario = latch();
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let instance = Instance::of(&scenario, &Which::Typ);
        let mut trace = Trace::default();
        program.machine().run(&instance, &Control::default(), &mut trace);
        let mut expected: Vec<String> = vec![];
        for change in &trace.changes {
            let name = scenario.circuit.name(change.net);
            expected.push(format!("{},{name},{}", change.at.from_start().decimal(scenario.unit), change.new));
        }
        let (text, _) = table(0, false).unwrap();
        assert_eq!(text.lines().skip(5).collect::<Vec<_>>(), expected);
    }

    /// A device with room for so many bytes.
    struct Small(usize);

    impl Write for Small {
        fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
            self.0 = self.0.checked_sub(bytes.len()).ok_or_else(|| io::Error::other("full"))?;
            Ok(bytes.len())
        }

        fn flush(&mut self) -> io::Result<()> {
            Ok(())
        }
    }

    #[test]
    fn a_full_device_is_told_once_and_ends_the_writing() {
        let scenario = latch();
        let program = Program::new(&scenario, &Control::default()).unwrap();
        let instance = Instance::of(&scenario, &Which::Typ);
        for room in [0, 30, 60, 80] {
            let told = Cell::new(0);
            let give_up = || told.set(told.get() + 1);
            let mut table = Overflow::new(&scenario, 2, || Ok(Small(room)), &give_up);
            program.machine().run(&instance, &Control::default(), &mut table);
            assert_eq!(table.finish(false).err().map(|error| error.to_string()), Some("full".into()), "{room}");
            assert_eq!(told.get(), 1, "{room}");
        }
        let told = Cell::new(0);
        let give_up = || told.set(told.get() + 1);
        let open = || Err::<Small, _>(io::Error::other("no place"));
        let mut table = Overflow::new(&scenario, 2, open, &give_up);
        program.machine().run(&instance, &Control::default(), &mut table);
        assert_eq!((table.finish(true).err().map(|it| it.to_string()), told.get()), (Some("no place".into()), 1));
    }
}
