//! What a part of a sweep has.

use std::path::Path;

use crate::output::words;
use crate::sweep::Part;

/// The text of a part that was written to a file: which samples it has, where it is, and what to do with it.
pub fn part(part: &Part, file: &Path) -> String {
    let done = part.cases.done();
    let (what, all) = (words::clean(&part.title), words::count(part.plan.samples));
    let conditions = match part.cases.0.len() {
        1 => String::new(),
        many => format!(", under {} conditions and with nominal delays", many - 1),
    };
    format!(
        "{what}: {} of {all}{conditions}\nkept in {}; `stillgate merge` puts the parts of a sweep together\n",
        done.words(),
        file.display()
    )
}
