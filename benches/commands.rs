//! Whole commands on generated files, each beside the limit (reading the same bytes and summing
//! them) and beside a path over well-kept libraries (`stl_io` with its validation, or `tobj`, then
//! `parry3d-f64`), in the same run, as ratios. The worst ratio stands first.
//!
//! `cargo bench --bench commands`; a number after `--` divides the sizes.
#![allow(clippy::unwrap_used, clippy::expect_used, missing_docs)]

use std::fs::File;
use std::hint::black_box;
use std::io::{BufReader, Read};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use bismar::stream::{Keys, of_stream};
use parry3d_f64::mass_properties::MassProperties;
use parry3d_f64::math::Vector;

mod support;

/// The shortest of a few runs: the others were disturbed.
fn best(mut run: impl FnMut()) -> Duration {
    let begin = Instant::now();
    let mut best = Duration::MAX;
    for n in 0.. {
        let start = Instant::now();
        run();
        best = best.min(start.elapsed());
        if n >= 9 || begin.elapsed() > Duration::from_secs(3) {
            break;
        }
    }
    best
}

/// Every byte read into a buffer of each thread and summed.
fn limit(path: &Path) -> u64 {
    use std::os::unix::fs::FileExt;
    const STEP: u64 = 200 << 10;
    let file = File::open(path).unwrap();
    let len = file.metadata().unwrap().len();
    let threads = std::thread::available_parallelism().map_or(1, usize::from) as u64;
    let of_thread = |k: u64| {
        let mut buffer = vec![0; STEP as usize];
        let mut sum = 0u64;
        for at in (k * STEP..len).step_by((threads * STEP) as usize) {
            let part = &mut buffer[..(len - at).min(STEP) as usize];
            file.read_exact_at(part, at).unwrap();
            let (words, _) = part.as_chunks::<8>();
            let add = |s: u64, w: &[u8; 8]| s.wrapping_add(u64::from_le_bytes(*w));
            sum = words.iter().fold(sum, add);
        }
        sum
    };
    std::thread::scope(|s| {
        let all: Vec<_> = (0..threads)
            .map(|k| s.spawn(move || of_thread(k)))
            .collect();
        all.into_iter()
            .map(|t| t.join().unwrap())
            .fold(0, u64::wrapping_add)
    })
}

/// Reads, validates and integrates with libraries.
fn by_libraries(path: &Path) -> f64 {
    let (vertices, corners): (Vec<Vector>, Vec<[u32; 3]>) = if path.extension().unwrap() == "obj" {
        let options = tobj::LoadOptions::default();
        let (models, _) = tobj::load_obj(path, &options).unwrap();
        let (mut vertices, mut corners) = (Vec::new(), Vec::new());
        for m in models.into_iter().map(|m| m.mesh) {
            let base = vertices.len() as u32;
            let (points, _) = m.positions.as_chunks::<3>();
            vertices.extend(points.iter().map(|p| Vector::new(p[0], p[1], p[2])));
            let (faces, _) = m.indices.as_chunks::<3>();
            corners.extend(faces.iter().map(|f| f.map(|i| base + i)));
        }
        (vertices, corners)
    } else {
        let mut file = BufReader::new(File::open(path).unwrap());
        let mesh = stl_io::read_stl(&mut file).unwrap();
        // What it says is not what is measured: it refuses nested shells, say.
        let _ = black_box(mesh.validate());
        let wide = |v: &stl_io::Vertex| v.0.map(f64::from);
        let vertices = mesh.vertices.iter().map(wide);
        (
            vertices.map(|v| Vector::new(v[0], v[1], v[2])).collect(),
            mesh.faces
                .iter()
                .map(|f| f.vertices.map(|i| i as u32))
                .collect(),
        )
    };
    MassProperties::from_trimesh(1.0, &vertices, &corners).mass()
}

fn weigh(path: &Path, whole: bool) {
    let mut command = Command::new(env!("CARGO_BIN_EXE_bismar"));
    command.args(["weigh", "--json", "--unit", "mm"]).arg(path);
    command.args(whole.then_some("--whole"));
    let status = command.stdout(Stdio::null()).status().unwrap();
    assert!(status.code().is_some_and(|c| c < 2), "{path:?}: {status}");
}

struct Row {
    what: String,
    time: Duration,
    limit: Duration,
    libraries: Duration,
}

fn of_file(rows: &mut Vec<Row>, name: &str, path: &Path) {
    let limit_time = best(|| {
        black_box(limit(path));
    });
    let libraries = best(|| {
        black_box(by_libraries(path));
    });
    for (whole, word) in [(true, "weigh --whole"), (false, "weigh")] {
        rows.push(Row {
            what: format!("{word}, {name}"),
            time: best(|| weigh(path, whole)),
            limit: limit_time,
            libraries,
        });
    }
}

/// Binary STL of any length whose records come around again and again.
struct Around<'a> {
    head: &'a [u8],
    records: &'a [u8],
    at: u64,
    end: u64,
}

impl Read for Around<'_> {
    fn read(&mut self, to: &mut [u8]) -> std::io::Result<usize> {
        let from = match (self.at as usize).checked_sub(self.head.len()) {
            None => &self.head[self.at as usize..],
            Some(at) => &self.records[at % self.records.len()..],
        };
        let n = from.len().min(to.len()).min((self.end - self.at) as usize);
        to[..n].copy_from_slice(&from[..n]);
        self.at += n as u64;
        Ok(n)
    }
}

/// A ball in 500 layers, beside weighing it as a solid.
fn printed(path: &Path) {
    let layers = || {
        let mut command = Command::new(env!("CARGO_BIN_EXE_bismar"));
        command.args(["weigh", "--json", "--unit", "mm", "--layers", "0.2"]);
        command.args(["--wall", "1.2", "--skin", "0.8", "--infill", "20"]);
        let status = command.arg(path).stdout(Stdio::null()).status().unwrap();
        assert!(status.success(), "{status}");
    };
    let (print, solid) = (best(layers), best(|| weigh(path, false)));
    println!(
        "weigh --layers, 500 of them: {:.3} s, {:.1} × weigh",
        print.as_secs_f64(),
        print.as_secs_f64() / solid.as_secs_f64()
    );
}

/// Time a triangle must not grow with their number.
fn growth(divisor: u64) {
    let rings = support::rings_for(10_000);
    let solid: Vec<_> = support::sphere(rings, 50.0, [1.0; 3]).collect();
    let records = &support::binary_stl(&solid)[84..];
    for millions in [1, 10, 100] {
        let times = (millions * 1_000_000 / divisor / solid.len() as u64).max(1);
        let count = times * solid.len() as u64;
        let head = &support::header(count)[..];
        let time = best(|| {
            let end = 84 + 50 * count;
            let stream = Around {
                head,
                records,
                at: 0,
                end,
            };
            let (totals, _) = of_stream(stream, &Keys::published()).unwrap();
            assert!(totals.certificate.cancels() && totals.triangles == count);
        });
        let each = time.as_secs_f64() * 1e9 / count as f64;
        println!(
            "stream of {count:>9} triangles: {:>8.4} s, {each:.1} ns a triangle",
            time.as_secs_f64()
        );
    }
}

fn main() {
    let divisor: u64 = match std::env::args().find_map(|a| a.parse().ok()) {
        Some(n) => n,
        None if std::env::args().any(|a| a == "--bench") => 1,
        // As a test: that it runs.
        None => 1000,
    };
    let folder = std::env::temp_dir().join(format!("bismar-bench-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    let write = |name: &str, bytes: Vec<u8>| -> PathBuf {
        let path = folder.join(name);
        std::fs::write(&path, bytes).unwrap();
        path
    };
    let sphere = |triangles: u64| -> Vec<support::Triangle> {
        let rings = support::rings_for(triangles / divisor);
        support::sphere(rings, 50.0, [12.5, -3.0, 80.0]).collect()
    };
    let mut rows = Vec::new();
    let mut measure = |name: &str, path: PathBuf| {
        of_file(&mut rows, name, &path);
        std::fs::remove_file(path).unwrap();
    };
    measure(
        "5 M triangles of binary STL",
        write("ordered.stl", support::binary_stl(&sphere(5_240_000))),
    );
    measure(
        "the same, shuffled",
        write(
            "shuffled.stl",
            support::binary_stl(&support::shuffled(sphere(5_240_000))),
        ),
    );
    let n = (500_000 / divisor) as u32;
    measure(
        "2 M slivers",
        write("slivers.stl", support::binary_stl(&support::slivers(n))),
    );
    let n = (1000 / divisor).max(3) as u32;
    measure(
        "1,000 nested shells of 1,300",
        write(
            "nested.stl",
            support::binary_stl(&support::nested_spheres(n, 1300)),
        ),
    );
    let spheres = |count: u32, each: u64| support::row_of_spheres(count, each);
    let row: Vec<_> = spheres(n, 1300).into_iter().flat_map(|(_, t)| t).collect();
    measure(
        "1,000 shells of 1,300 side by side",
        write("row.stl", support::binary_stl(&row)),
    );
    measure(
        "1.3 M triangles of text STL",
        write("text.stl", support::text_stl(&sphere(1_300_000))),
    );
    measure(
        "1.3 M triangles of OBJ",
        write(
            "one.obj",
            support::obj(&[("ball".into(), sphere(1_300_000))]),
        ),
    );
    let n = (200 / divisor).max(2) as u32;
    measure(
        "200 named bodies, 1 M triangles of OBJ",
        write("many.obj", support::obj(&spheres(n, 5000))),
    );
    let ball = write("printed.stl", support::binary_stl(&sphere(1_310_000)));
    printed(&ball);
    std::fs::remove_file(ball).unwrap();
    std::fs::remove_dir_all(&folder).unwrap();
    let ratio = |a: Duration, b: Duration| a.as_secs_f64() / b.as_secs_f64();
    rows.sort_by(|a, b| ratio(b.time, b.limit).total_cmp(&ratio(a.time, a.limit)));
    println!(
        "{:<56} {:>9} {:>9} {:>9} {:>9} {:>11}",
        "", "s", "limit s", "× limit", "libr. s", "libraries ÷"
    );
    for r in &rows {
        println!(
            "{:<56} {:>9.4} {:>9.4} {:>9.2} {:>9.4} {:>11.1}",
            r.what,
            r.time.as_secs_f64(),
            r.limit.as_secs_f64(),
            ratio(r.time, r.limit),
            r.libraries.as_secs_f64(),
            ratio(r.libraries, r.time),
        );
    }
    let help = best(|| {
        let mut command = Command::new(env!("CARGO_BIN_EXE_bismar"));
        command
            .arg("--help")
            .stdout(Stdio::null())
            .status()
            .unwrap();
    });
    println!("bismar --help: {:.4} s", help.as_secs_f64());
    growth(divisor);
}
