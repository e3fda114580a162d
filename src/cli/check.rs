//! `dutybank check`: all problems of a file, and the network in words.

use super::Failure;
use super::args::CheckOptions;
use super::files::{Input, colour_on_standard_error, complain, print};
use crate::diagnostic::Diagnostics;
use crate::output::describe::describe;

pub(super) fn check(options: &CheckOptions) -> Result<(), Failure> {
    let input = Input::open(&options.input.file)?;
    let system = input
        .with_load(|load| input.document.check(load))
        .map_err(|diagnostics| input.rejected(&diagnostics))?;
    let mut cautions = Diagnostics::default();
    system
        .cautions
        .iter()
        .cloned()
        .for_each(|caution| cautions.push(caution));
    if !system.cautions.is_empty() {
        complain(&cautions.render(
            input.document.text(),
            &input.name,
            colour_on_standard_error(),
        ));
    }
    print(&describe(&system))
}
