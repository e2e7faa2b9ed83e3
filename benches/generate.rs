//! Writes a mesh made by rule, for measuring: `generate KIND TRIANGLES FILE`, with KIND one of
//! sphere, shuffled, slivers, nested, text, obj, bodies; or a library of them into a folder:
//! `generate corpus FILES FOLDER` (2,000 files are 5 M triangles, many small, few large, one in
//! twenty broken), `generate tiny FILES FOLDER` (12 triangles each).

use std::io::{BufWriter, Write};

#[path = "support/mod.rs"]
mod support;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let args: Vec<String> = std::env::args().collect();
    let [_, kind, triangles, path] = &args[..] else {
        return Err("generate KIND TRIANGLES FILE".into());
    };
    let wanted: u64 = triangles.parse()?;
    if matches!(kind.as_str(), "corpus" | "tiny") {
        return support::library(kind == "tiny", wanted, path.as_ref()).map_err(Into::into);
    }
    let rings = support::rings_for(wanted);
    let sphere = || support::sphere(rings, 50.0, [12.5, -3.0, 80.0]);
    let mut out = BufWriter::new(std::fs::File::create(path)?);
    match kind.as_str() {
        "sphere" => {
            out.write_all(&support::header(support::sphere_count(rings)))?;
            for t in sphere() {
                out.write_all(&support::record(&t))?;
            }
        }
        "shuffled" => {
            out.write_all(&support::binary_stl(&support::shuffled(sphere().collect())))?;
        }
        "slivers" => {
            let n = u32::try_from(wanted.div_ceil(4))?;
            out.write_all(&support::binary_stl(&support::slivers(n)))?;
        }
        "nested" => {
            let shells = u32::try_from(wanted.div_ceil(1300))?;
            out.write_all(&support::binary_stl(&support::nested_spheres(shells, 1300)))?;
        }
        "text" => out.write_all(&support::text_stl(&sphere().collect::<Vec<_>>()))?,
        "obj" => out.write_all(&support::obj(&[("ball".into(), sphere().collect())]))?,
        "bodies" => out.write_all(&support::obj(&support::row_of_spheres(200, wanted / 200)))?,
        other => return Err(format!("no kind is called {other}").into()),
    }
    Ok(out.flush()?)
}
