//! `weigh --whole --slice`: one slice of a mesh, summed by itself.

use std::path::{Path, PathBuf};

use super::inputs::{Input, MeshArgs, digest};
use super::{Answer, Common};
use crate::error::{Error, Kind, Result};
use crate::format::write_whole;
use crate::report::add::slice_text;
use crate::report::{Document, InputFact, PROGRAM, to_json};
use crate::stream::{PARTIAL_SCHEMA, Slice, slice_of_path};

/// Sums the slice and writes its partial down.
///
/// # Errors
/// `usage` unless there is one file; those of reading; `cannot-write`.
pub(super) fn run(
    mut inputs: Vec<(PathBuf, Result<Input>)>,
    slice: Slice,
    output: Option<&Path>,
    args: &MeshArgs,
    common: &Common,
) -> Result<Answer> {
    let usage = |message: &str, advice: &str| Err(Error::new(Kind::Usage, message, advice));
    if inputs.len() != 1 {
        return usage("--slice is of one file", "name one mesh file");
    }
    let (path, input) = inputs.swap_remove(0);
    let input = input?;
    if input.path.as_os_str() == "-" {
        return usage(
            "--slice cannot be taken from standard input: a stream has no place to begin at",
            "name a file",
        );
    }
    if common.csv {
        return usage("a partial has no CSV form", "leave out --csv");
    }
    let mut partial = slice_of_path(&input.path, slice, args.format)?;
    partial.unit = args.unit;
    let hash = match args.hash {
        true => Some(digest(&crate::format::Bytes::open(&input.path)?)),
        false => None,
    };
    let document = to_json(&Document {
        schema: PARTIAL_SCHEMA,
        program: PROGRAM,
        exit: 0,
        warnings: Vec::new(),
        inputs: vec![InputFact::new(&path, Some(partial.identity().bytes), hash)],
        body: &partial,
    });
    let output = output.filter(|o| o.as_os_str() != "-");
    if let Some(output) = output {
        write_whole(output, |to| to.write_all(document.as_bytes()))?;
    }
    let text = match output {
        Some(output) if !common.json => slice_text(slice, &path, &partial, output),
        _ => document,
    };
    Ok(Answer::of_text(text.into_bytes()))
}
