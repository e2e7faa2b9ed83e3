//! Faults of files: syntax, inclusion, meshes that cannot be weighed.

use super::*;

#[test]
fn syntax() {
    let errors = bench().faults("[assembly]\nunit = \"mm\"\n[[item]]\nname = \nmass = 3\n");
    let found: Vec<_> = errors.iter().map(|e| (e.line.unwrap(), e.kind)).collect();
    assert_eq!(
        found,
        [(4, Kind::UnknownFormat), (5, Kind::Unit)],
        "{errors:#?}"
    );
    let bench = bench();
    bench.put("it.json", "{\n \"assembly\": {\n  \"unit\": mm }\n}");
    let errors = bench.load("it.json").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownFormat, Some(3))
    );
    bench.put(
        "it.json",
        "{\"assembly\": {\"unit\": \"mm\"},\n \"assembly\": 1}",
    );
    let errors = bench.load("it.json").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownFormat, Some(2))
    );
    bench.put(
        "it.json",
        "{\"assembly\":\n {\"unit\": \"mm\",\n \"nam\": \"x\"}}",
    );
    let errors = bench.load("it.json").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownKey, Some(3))
    );
    for text in [
        "[1]",
        "{",
        "{\"a\":1",
        &"[".repeat(5000),
        &format!("{{\"a\":{}", "[".repeat(5000)),
    ] {
        bench.put("deep.json", text);
        bench.put("deep.toml", &format!("a = {text}"));
        assert!(bench.load("deep.json").is_err());
        assert!(bench.load("deep.toml").is_err());
    }
    std::fs::write(bench.dir.path().join("bytes.toml"), b"[assembly]\n\xff\xfe").unwrap();
    let errors = bench.load("bytes.toml").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::UnknownFormat, Some(2))
    );
    let errors = bench.load("none.toml").unwrap_err();
    assert_eq!(errors[0].kind, Kind::NotFound);
}

#[test]
fn includes() {
    let bench = bench();
    let head = "[assembly]\nunit = \"mm\"\n";
    bench.put(
        "a.toml",
        &format!("{head}[[group]]\ninclude = \"sub/b.toml\"\n"),
    );
    bench.put(
        "sub/b.toml",
        &format!("{head}[[group]]\ninclude = \"../a.toml\"\n"),
    );
    let errors = bench.load("a.toml").unwrap_err();
    assert_eq!(
        (errors[0].kind, errors[0].line),
        (Kind::Cycle, Some(4)),
        "{errors:#?}"
    );
    assert!(
        errors[0].message.contains("a.toml → b.toml → a.toml"),
        "{errors:#?}"
    );
    assert!(errors[0].path.as_ref().unwrap().ends_with("sub/b.toml"));
    bench.put(
        "c.toml",
        &format!("{head}[[group]]\ninclude = \"d.toml\"\n"),
    );
    let errors = bench.load("c.toml").unwrap_err();
    assert_eq!((errors[0].kind, errors[0].line), (Kind::NotFound, Some(4)));
    assert!(errors[0].advice.contains("a.toml"));
    // Faults of both files together: the outer's first, then the inner's by line.
    bench.put(
        "e.toml",
        &format!("{head}x = 1\n[[group]]\ninclude = \"f.toml\"\n"),
    );
    bench.put("f.toml", "[[item]]\nname = \"i\"\nmass = 1\n");
    let errors = bench.load("e.toml").unwrap_err();
    let lines: Vec<_> = errors.iter().map(|e| e.line.unwrap()).collect();
    assert_eq!(lines, [3, 1, 3], "{errors:#?}");
    // Thirty-two files deep is read, one more is not.
    let chain = |n: usize| {
        for k in 0..n {
            let text = format!(
                "{head}[[group]]\nname = \"g\"\ninclude = \"n{}.toml\"\n",
                k + 1
            );
            bench.put(&format!("n{k}.toml"), &text);
        }
        bench.put(&format!("n{n}.toml"), &format!("{head}{ITEM}"));
        bench.load("n0.toml")
    };
    assert!(chain(DEEPEST).is_ok());
    let errors = chain(DEEPEST + 1).unwrap_err();
    assert_eq!(
        (errors[0].kind, errors.len()),
        (Kind::Cycle, 1),
        "{errors:#?}"
    );
    // Each includes the next twice: two to the thirtieth, and refused before memory is taken.
    for k in 0..30 {
        let group = |n: &str| format!("[[group]]\nname = \"{n}\"\ninclude = \"m{}.toml\"\n", k + 1);
        bench.put(
            &format!("m{k}.toml"),
            &format!("{head}{}{}", group("a"), group("b")),
        );
    }
    bench.put("m30.toml", &format!("{head}{ITEM}"));
    let errors = bench.load("m0.toml").unwrap_err();
    assert_eq!((errors[0].kind, errors.len()), (Kind::TooLarge, 1));
    let nest = "[[group]]\nname = \"g\"\ncount = 1000\n[[group.group]]\nname = \"h\"\ncount = 1000\n\
                [[group.group.item]]\nname = \"i\"\nmass = \"1 g\"\n";
    bench.put("o.toml", &format!("{head}{nest}"));
    assert_eq!(bench.load("o.toml").unwrap_err()[0].kind, Kind::TooLarge);
}

#[test]
fn open_bodies_and_broken_meshes() {
    let mut open = block("frame", [0.0; 3], [1.0; 3]);
    open.refused = true;
    let mut bench = Bench::new().mesh("rover.obj", vec![open, block("lid", [0.0; 3], [1.0; 3])]);
    let lid = PART.replace("frame", "lid").replace("\"f\"", "\"l\"");
    let (b, _) = bench.of(&format!(
        "[assembly]\nunit = \"mm\"\n{PART}{lid}[[limit]]\nmass = {{ to = \"1 t\" }}\n"
    ));
    assert_eq!(b.exit(), 2);
    let error = b.error.unwrap();
    assert_eq!((error.kind, error.line), (Kind::NotClosed, Some(5)));
    assert!(error.message.contains("4 open edges"));
    // The lid still gets its answer; nothing is said of the whole.
    assert_eq!(b.parts.len(), 1);
    assert_eq!(
        (b.parts[0].share_of_mass, b.total, b.limits.len()),
        (None, None, 0)
    );
    let mut bench = Bench::new();
    bench.put("rover.obj", "");
    let errors = bench.faults(&format!("[assembly]\nunit = \"mm\"\n{PART}{lid}"));
    assert_eq!((errors[0].kind, errors.len()), (Kind::Truncated, 1));
}

#[test]
fn a_mesh_in_place_of_an_assembly_is_told_as_such() {
    let bench = bench();
    let mut stl = vec![0u8; 84];
    stl[80] = 1;
    stl.extend([0xff; 50]);
    bench.put("part.obj", "v 0 0 0\n");
    std::fs::write(bench.dir.path().join("part.STL"), &stl).unwrap();
    std::fs::write(bench.dir.path().join("part.bin"), &stl).unwrap();
    for name in ["part.obj", "part.STL", "part.bin"] {
        let errors = bench.load(name).unwrap_err();
        assert_eq!(errors.len(), 1, "{errors:#?}");
        assert_eq!(errors[0].kind, Kind::UnknownFormat);
        assert!(errors[0].message.contains("a mesh"), "{errors:#?}");
        assert!(errors[0].advice.contains("bismar weigh"), "{errors:#?}");
    }
}
