//! `bismar materials`: densities, their spread, their sources.

use clap::Args;

use super::{Answer, Common, Gathered};
use crate::error::Result;
use crate::material::Table;
use crate::report::materials::{MaterialRow, MaterialsBody, csv, render};

/// Arguments of `materials`.
#[derive(Args, Clone, Debug)]
pub(super) struct MaterialsArgs {
    /// Only materials with this word in their id, name or an alias
    word: Option<String>,
}

/// Runs the command.
///
/// # Errors
/// `unknown-name` where the word matches nothing.
pub(super) fn run(args: &MaterialsArgs, common: &Common) -> Result<Answer> {
    let table = Table::standard();
    let found = match &args.word {
        None => table.all().iter().collect(),
        Some(word) => {
            let found = table.search(word);
            if found.is_empty() {
                // The same error as where the name is used, with the nearest names.
                table.get(word)?;
            }
            found
        }
    };
    let materials = found.into_iter().map(MaterialRow::of).collect();
    let none: Gathered<()> = Gathered {
        each: Vec::new(),
        warnings: Vec::new(),
        facts: Vec::new(),
    };
    none.finish(
        "bismar/materials/1",
        0,
        MaterialsBody { materials },
        common,
        render,
        csv,
    )
}
