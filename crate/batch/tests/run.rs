//! The command as it is run: what it prints, where, and its exit code.

use std::path::PathBuf;
use std::process::{Command, Output};

use serde_json::Value;

/// A directory of this test's own, gone with it.
struct Folder(PathBuf);

impl Folder {
    fn new(name: &str) -> Self {
        let path = std::env::temp_dir().join(format!("strikeline-{name}-{}", std::process::id()));
        std::fs::create_dir_all(&path).expect("a directory");
        Self(path)
    }

    fn file(&self, name: &str, text: &str) -> String {
        let path = self.0.join(name);
        std::fs::write(&path, text).expect("a file");
        path.to_str().expect("a plain path").to_string()
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

fn run(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_strikeline-batch")).args(arguments).output().expect("it starts")
}

fn stdout(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).expect("text")
}

/// A run that has to be refused with 2, nothing on standard output, and these words on standard error.
fn refused(arguments: &[&str], words: &str) {
    let output = run(arguments);
    let said = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(2), "{arguments:?}: {said}");
    assert!(output.stdout.is_empty(), "{arguments:?}: {}", stdout(&output));
    assert!(said.contains(words), "{arguments:?}: {said}");
}

/// Nothing but a kind and a capacity: the rest is default.
const SHORT: &str =
    r#"{"strikeline": 1, "name": "short", "cell": {"chemistry": "lco_pouch", "capacity": 2.28}}"#;

#[test]
fn exact_one_report_for_each_design() {
    let folder = Folder::new("reports");
    let demo = folder.file("demo.json", &stdout(&run(&["demo"])));
    let short = folder.file("short.json", SHORT);
    let output = run(&[&demo, &short]);
    assert_eq!(output.status.code(), Some(0));
    let reports: Vec<Value> =
        stdout(&output).lines().map(|l| serde_json::from_str(l).expect("a report a line")).collect();
    assert_eq!(reports.len(), 2);
    assert_eq!(reports[1]["name"], "short");
    for report in &reports {
        assert!(report["verdict"]["word"].is_string() && report["verdict"]["reason"].is_string());
        assert!(report["charge"]["full_presses"].is_u64());
        assert!(report["charge"]["ledger_residual_rel"].as_f64().expect("a number").abs() < 1e-6);
        assert!(report["press"].get("events").is_none() && report["press"].get("trace").is_none());
    }
    let more = run(&["--events", "--trace", "--presses", &demo]);
    let report: Value = serde_json::from_str(&stdout(&more)).expect("a report");
    assert!(report["press"]["events"].as_array().is_some_and(|e| !e.is_empty()));
    assert!(report["press"]["trace"]["t_s"].as_array().is_some_and(|t| t.len() > 10));
    let presses = report["charge"]["presses_list"].as_array().map(Vec::len);
    assert_eq!(presses, report["charge"]["presses"].as_u64().map(|n| n as usize));
    assert_eq!(stdout(&run(&[&demo, &short])), stdout(&output), "the same twice");
}

#[test]
fn exact_a_link_opens_to_the_same_report() {
    let folder = Folder::new("link");
    let typed = r#"{"strikeline": 1, "cell": {"capacity": "2800 mAh"}, "load": {"strike": "3,35 V"}}"#;
    let typed = folder.file("typed.json", typed);
    let link = stdout(&run(&["link", &typed]));
    let opened = folder.file("opened.json", &stdout(&run(&["open", link.trim()])));
    assert_eq!(stdout(&run(&[&typed])), stdout(&run(&[&opened])));
}

#[test]
fn exact_what_is_wrong_is_said_with_2() {
    let folder = Folder::new("refused");
    refused(&[], "design.json");
    refused(&["--events"], "no design file is given");
    refused(&["--colour", "x.json"], "--colour is not an option");
    refused(&[folder.0.join("none.json").to_str().expect("a plain path")], "none.json");
    for (text, words) in [
        ("", "not a design file"),
        ("{", "not a design file"),
        (r#"{"strikeline": 1, "cell": {"capasity": 1}}"#, "cell.capasity"),
        (r#"{"strikeline": 1, "cell": {"capacity": "3 V"}}"#, "cell.capacity"),
        (r#"{"strikeline": 1, "load": {"strike": 2, "hold": 3}}"#, "load.hold"),
        (r#"{"strikeline": 3}"#, "version 3"),
        (r#"{"strikeline": 2, "use": {"press": 1, "press": 2}}"#, "“use.press” stands twice"),
    ] {
        refused(&[&folder.file("bad.json", text)], words);
    }
    let faulty =
        folder.file("two.json", r#"{"strikeline": 1, "cell": {"capacity": 0}, "use": {"press": -1}}"#);
    refused(&[&faulty], "cell.capacity");
    refused(&[&faulty], "use.press");
    refused(&["open", "#1.AAAA"], "damaged");
    refused(&["open", "#9.AAAA"], "version 9");
    std::fs::write(folder.0.join("bytes.json"), [0xff, 0xfe, 0x00]).expect("a file");
    refused(&[folder.0.join("bytes.json").to_str().expect("a plain path")], "bytes.json");
}

#[test]
fn exact_a_class_of_board_takes_the_place_of_the_designs_own() {
    let folder = Folder::new("boards");
    let short = folder.file("short.json", SHORT);
    let none = r#"{"strikeline": 1, "name": "short", "cell": {"capacity": 2.28}, "board": {"arrangement": "no_board"}}"#;
    let none = folder.file("none.json", none);
    let output = run(&["--board", "none", &short]);
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(stdout(&output), stdout(&run(&[&none])));
    assert_ne!(stdout(&output), stdout(&run(&[&short])));
    let report: serde_json::Value = serde_json::from_str(&stdout(&output)).expect("JSON");
    assert_eq!(report["hazards"]["findings"][0]["level"], "stop");
    assert!(report["hazards"]["checks_made"].as_u64() > Some(10));
    let kinds = report["hazards"]["findings"].as_array().expect("a list");
    assert!(kinds.iter().any(|f| f["kind"] == "short_unprotected"), "{kinds:?}");
    assert_eq!(report["wiring"][0]["wired"], "through_board");
    assert_eq!(report["verdict"]["word"], "fails");
    refused(&["--board", "best", &short], "two_level");
    refused(&["--board"], "wants a class");
    assert!(stdout(&run(&["boards"])).lines().any(|l| l.starts_with("three_level: ")));
}

#[test]
fn exact_a_bad_file_takes_nothing_from_the_others() {
    let folder = Folder::new("some");
    let short = folder.file("short.json", SHORT);
    let bad = folder.file("bad.json", "{");
    let faulty = folder.file("faulty.json", r#"{"strikeline": 2, "use": {"press": -1}}"#);
    let alone = run(&[&short]);
    let output = run(&[&bad, &short, &faulty, &short]);
    let said = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(2), "{said}");
    assert_eq!(stdout(&output), stdout(&alone).repeat(2));
    assert!(said.contains("bad.json") && said.contains("faulty.json: use.press"), "{said}");
}

#[test]
fn exact_a_replay_prints_a_line_for_a_row() {
    let folder = Folder::new("replay");
    let design = folder.file("short.json", SHORT);
    // Uneven steps, a charging current, a byte order mark and Windows line ends, as loggers write them.
    let log = "\u{feff}time_s,current_A,voltage_V,temperature_C\r\n0,0,4.15,23\r\n0.5,2,4.05,23\r\n60,2,4.0,23.1\r\n61,-1,4.1,23.1\r\n3600,-1,4.2,23\r\n";
    let log = folder.file("log.csv", log);
    let output = run(&["replay", &design, &log]);
    assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
    let lines: Vec<String> = stdout(&output).lines().map(str::to_string).collect();
    assert_eq!((lines.len(), lines[0].as_str()), (6, "time_s,predicted_V,predicted_C,soc"));
    assert!(lines[1].contains(",23.0000,"), "starts at the log's first temperature: {}", lines[1]);
    assert!(String::from_utf8_lossy(&output.stderr).contains("RMS"));
    let whole: Value =
        serde_json::from_str(&stdout(&run(&["replay", &design, &log, "--json", "--soc", "0.5"])))
            .expect("json");
    assert_eq!(whole["soc"][0], 0.5);
    assert!(whole["rms_V"].is_f64());
    // 2 A for 60 s take 120 A·s of 2.28 Ah.
    let used = 0.5 - whole["soc"][2].as_f64().expect("a number");
    assert!((used - (0.25 * 2.0 + 59.5 * 2.0) / (3600.0 * 2.28)).abs() < 1e-3, "{used}");
}

#[test]
fn exact_a_bad_log_is_said_with_2() {
    let folder = Folder::new("logs");
    let design = folder.file("short.json", SHORT);
    for (text, words) in [
        ("", "time_s"),
        ("time_s,voltage_V\n0,4\n", "current_A"),
        ("time_s,current_A\n", "no rows"),
        ("# a logger's own line\ntime_s,current_A\n0,1\n1,many\n", "line 4"),
        ("time_s,current_A\n0,NaN\n", "not finite"),
        ("time_s,current_A\n5,1\n4,1\n", "line 3"),
        ("time_s,current_A\n0,1\n1\n", "line"),
        ("time_s,current_A\n0,1e300\n1e9,1e300\n", "leaves all bounds"),
    ] {
        refused(&["replay", &design, &folder.file("log.csv", text)], words);
    }
    let log = folder.file("log.csv", "time_s,current_A\n0,1\n1,1\n");
    refused(&["replay", &design, &log, "--soc", "2"], "0 to 1");
    refused(&["replay", &design, &log, "--soc"], "wants a number");
    refused(&["replay", &design], "replay design.json log.csv");
}
