//! `dutybank completions` and `dutybank man`: what a shell and a manual reader want to know of the command itself.

use clap::CommandFactory;
use clap_mangen::Man;

use super::Failure;
use super::args::{Arguments, CompletionsOptions};
use super::files::print;

pub(super) fn completions(options: &CompletionsOptions) -> Result<(), Failure> {
    let mut script = Vec::new();
    clap_complete::generate(
        options.shell,
        &mut Arguments::command(),
        "dutybank",
        &mut script,
    );
    print(&String::from_utf8_lossy(&script))
}

/// The page of the command, and then that of each of its subcommands.
pub(super) fn man() -> Result<(), Failure> {
    let mut command = Arguments::command();
    command.build();
    let subcommands = command.get_subcommands().cloned();
    let pages = std::iter::once(command.clone()).chain(subcommands);
    let mut text = Vec::new();
    for page in pages.filter(|page| page.get_name() != "help") {
        Man::new(page)
            .render(&mut text)
            .map_err(|why| Failure::Broken(format!("the manual cannot be written: {why}")))?;
    }
    print(&String::from_utf8_lossy(&text))
}
