//! What the program does when no command is named: it opens the window, or writes the season sheet where there is none.

use std::path::Path;

use crate::scenario::Scenario;
use crate::window;

use super::{CliError, sheet};

pub(super) fn run(path: Option<&Path>) -> Result<(), CliError> {
    let scenario = match path {
        Some(path) => Scenario::load(path)?,
        None => Scenario::embedded()?,
    };
    match window::open(scenario, path.map(Path::to_owned), super::now()) {
        Ok(()) => Ok(()),
        Err(reason) => {
            eprintln!("No window, as {reason}: writing the season sheet instead.");
            sheet::run_default(path)
        }
    }
}
