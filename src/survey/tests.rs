//! The survey as a library: rows on any number of threads, tables in every format, what is reused.

use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU64, Ordering::SeqCst};

use super::*;

fn fixtures() -> Vec<(PathBuf, Option<Error>)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures");
    let out = files(&[folder]).unwrap();
    assert!(out.len() > 50);
    out
}

fn go_on(_: &Progress) -> bool {
    true
}

fn of(files: &[(PathBuf, Option<Error>)], options: &Options) -> Vec<Row> {
    let none = Known::default();
    survey(files, options, &none, &|_| Ok(()), &go_on)
        .unwrap()
        .rows
}

#[test]
fn rows_are_the_same_on_any_number_of_threads_and_after_every_format() {
    let mut options = Options::default();
    options.substances.assign("*bracket*=PLA").unwrap();
    options.substances.rest = Some(crate::masses::Substance {
        name: None,
        density: crate::quantity::Quantity::exact(2700.0),
    });
    let rows = of(&fixtures(), &options);
    assert!(rows.iter().any(|r| r.error.is_some()) && rows.iter().any(|r| r.mass_kg.is_some()));
    for n in [1, 2, 5] {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(n)
            .build()
            .unwrap();
        assert_eq!(pool.install(|| of(&fixtures(), &options)), rows, "{n}");
    }
    let folder = tempfile::tempdir().unwrap();
    for name in ["t.parquet", "t.csv", "t.ndjson"] {
        let path = folder.path().join(name);
        write_table(&path, &rows).unwrap();
        assert_eq!(read_table(&path).unwrap(), rows, "{name}");
        write_table(&path, &[]).unwrap();
        assert_eq!(read_table(&path).unwrap(), [], "{name}");
        std::fs::write(&path, "nothing of the kind").unwrap();
        assert_eq!(read_table(&path).unwrap_err().kind, Kind::UnknownFormat);
    }
    assert_eq!(
        TableFormat::of(Path::new("a.txt")).unwrap_err().kind,
        Kind::Usage
    );
}

#[test]
fn unchanged_files_are_not_weighed_again_and_changed_ones_are() {
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    let cube =
        std::fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/cube.obj")).unwrap();
    for i in 0..5 {
        std::fs::write(at(&format!("{i}.obj")), &cube).unwrap();
    }
    let table = at("t.csv");
    let run = |options: &Options| {
        let found = files(&[folder.path().to_path_buf()]).unwrap();
        survey_to_table(&found, &table, options, &go_on).unwrap()
    };
    let first = run(&Options::default());
    assert_eq!((first.reused, first.rows.len()), (0, 5));
    assert!(!Journal::beside(&table).exists());
    let mut again = run(&Options::default());
    assert_eq!((again.reused, &again.rows), (5, &first.rows));
    // Another material weighs nothing anew, another unit all.
    let mut heavy = Options::default();
    heavy.substances.assign("*=steel S235").unwrap();
    again = run(&heavy);
    assert_eq!(again.reused, 5);
    assert!(again.rows.iter().all(|r| r.mass_kg.is_some()));
    assert_eq!(
        run(&Options {
            unit: Some(LengthUnit::In),
            ..Options::default()
        })
        .reused,
        0
    );
    assert_eq!(run(&Options::default()).reused, 0);
    std::fs::write(at("3.obj"), [&cube[..], b"\n# another\n"].concat()).unwrap();
    assert_eq!(run(&Options::default()).reused, 4);
}

#[test]
fn a_run_that_was_stopped_goes_on_where_it_was() {
    let folder = tempfile::tempdir().unwrap();
    let found = fixtures();
    let table = folder.path().join("t.ndjson");
    let options = Options::default();
    let left = AtomicU64::new(20);
    let stop = |_: &Progress| left.fetch_sub(1, SeqCst) > 1;
    let e = survey_to_table(&found, &table, &options, &stop).unwrap_err();
    assert_eq!(e.kind, Kind::Usage);
    assert!(!table.exists());
    // A last line that was cut off, and one of a body whose siblings are missing.
    let journal = Journal::beside(&table);
    let mut text = std::fs::read(&journal).unwrap();
    text.truncate(text.len() - 30);
    std::fs::write(&journal, text).unwrap();
    let rest = survey_to_table(&found, &table, &options, &go_on).unwrap();
    assert!((15..=20).contains(&rest.reused), "{}", rest.reused);
    assert_eq!(rest.rows, of(&found, &options));
    assert_eq!(read_table(&table).unwrap(), rest.rows);
    assert!(!journal.exists());
}

#[test]
fn rows_of_a_file_are_only_known_together() {
    let mut rows = of(&fixtures(), &Options::default());
    let many = rows.iter().position(|r| r.bodies > Some(1)).unwrap();
    let (path, hash) = (
        rows[many].path.clone().unwrap(),
        rows[many].sha256.clone().unwrap(),
    );
    let mut known = Known::default();
    known.take(rows.clone(), &Options::default());
    assert!(known.get(&path, &hash).is_some() && known.get(&path, "0").is_none());
    rows.remove(many);
    let mut known = Known::default();
    known.take(rows.clone(), &Options::default());
    assert!(known.get(&path, &hash).is_none());
    for row in &mut rows {
        row.program = Some("bismar 0.0.0".into());
    }
    let mut known = Known::default();
    known.take(rows, &Options::default());
    assert!(known.is_empty());
}

#[test]
fn a_file_past_the_budget_is_a_row_and_two_runs_keep_apart() {
    let options = Options {
        memory: (1 << 20) + 4000,
        ..Options::default()
    };
    let rows = of(&fixtures(), &options);
    let big = rows
        .iter()
        .filter(|r| r.error_kind.as_deref() == Some("too-large"));
    assert!(big.clone().count() > 3 && rows.iter().any(|r| r.volume_m3.is_some()));
    assert!(big.clone().all(|r| r.bytes > Some(1000)));
    let folder = tempfile::tempdir().unwrap();
    let table = folder.path().join("t.csv");
    let _held = Journal::open(&table).unwrap();
    assert_eq!(Journal::open(&table).unwrap_err().kind, Kind::CannotWrite);
}

#[test]
fn globs_folders_and_names_are_found_once_and_in_order() {
    let folder = tempfile::tempdir().unwrap();
    let at = folder.path();
    std::fs::create_dir_all(at.join("a/deep")).unwrap();
    for name in ["a/2.stl", "a/1.obj", "a/deep/3.STL", "a/notes.txt", "4.stl"] {
        std::fs::write(at.join(name), "").unwrap();
    }
    let find = |wheres: &[&str]| -> Vec<String> {
        let wheres: Vec<PathBuf> = wheres.iter().map(|w| at.join(w)).collect();
        let found = files(&wheres).unwrap();
        let name = |p: &Path| p.strip_prefix(at).unwrap().to_str().unwrap().to_owned();
        found.iter().map(|f| name(&f.0)).collect()
    };
    let all = ["4.stl", "a/1.obj", "a/2.stl", "a/deep/3.STL"];
    assert_eq!(find(&["."]).len(), 4);
    assert_eq!(find(&["a"]), all[1..]);
    assert_eq!(find(&["a/*.stl"]), ["a/2.stl"]);
    assert_eq!(
        find(&["**/*.{stl,STL}"]),
        ["4.stl", "a/2.stl", "a/deep/3.STL"]
    );
    assert_eq!(
        find(&["a/2.stl", "a", "a/notes.txt"]),
        ["a/2.stl", "a/1.obj", "a/deep/3.STL", "a/notes.txt"]
    );
    assert_eq!(find(&["none.stl"]), ["none.stl"]);
    assert_eq!(files(&[at.join("[")]).unwrap_err().kind, Kind::Usage);
}
