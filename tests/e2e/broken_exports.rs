//! Broken exports beside good ones: each costs only itself, and is told of in one clear sentence.

use serde_json::{Value, json};

use crate::export::{Run, small_study, time_of};
use crate::plant::{Design, Plant};
use crate::program::{Service, log, status};

const DESIGN: Design<'_> = Design {
    parts: 3,
    appraisers: &["KL", "MO"],
    trials: 2,
};

/// A second machine, whose exports are XML, with a plan of its own.
const FORM_TESTER: &str = r#"
[[instrument]]
name    = "form-2"
folders = ["forms"]
files   = ["*.xml"]
settle  = "600ms"
rescan  = "1s"

[instrument.read]
form           = "xml"
each           = "/export/run/feature"
part           = { xml = "../@part" }
trial          = { xml = "../@trial" }
characteristic = { xml = "@name" }
value          = { xml = "value", unit = "mm" }

[[plan]]
name        = "cover seat"
instruments = ["form-2"]
parts       = 2
trials      = 2
interaction = "keep"

[plan.limits]
watch = 0.10
act   = 0.30
"#;

/// One broken export and what must be told of it.
struct Broken {
    folder: &'static str,
    name: &'static str,
    bytes: Vec<u8>,
    list: &'static str,
    words: &'static [&'static str],
}

#[test]
fn broken_exports_cost_only_themselves() {
    let plant = Plant::with(DESIGN, None, FORM_TESTER, &["forms"]);
    let mut service = Service::start(&plant);
    let all = broken();
    for broken in &all {
        let place = plant.folder().join(broken.folder).join(broken.name);
        fs_err::write(place, &broken.bytes).expect("an export can be written");
    }
    for run in small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3) {
        plant.put(&format!("{}.xlsx", run.name()), &run.workbook());
    }
    for (part, trial, value) in [(1, 1, 0.011), (1, 2, 0.012), (2, 1, 0.017), (2, 2, 0.019)] {
        let place = plant
            .folder()
            .join(format!("forms/C{part} run-{trial}.xml"));
        fs_err::write(place, xml(part, trial, value)).expect("an export can be written");
    }

    service.wait_for_round(1, 1);
    let told = |s: &Value| {
        let rounds = s["rounds"].as_array().expect("rounds");
        entries(s, "refused").len() + entries(s, "set_aside").len() == all.len()
            && rounds.len() == 2
            && rounds.iter().all(|round| round["state"] == "complete")
    };
    let found = service.wait_until("a sentence for each broken export", told);
    assert_eq!(found["readings"]["used"], 24 + 4);
    assert_eq!(found["readings"]["set_aside"], 2);
    assert_eq!(status(&plant).and_then(|(code, _)| code), Some(1));
    service.stop();
    for broken in &all {
        assert_told_once(broken, &found, &log(&plant));
    }

    // The next start finds nothing new to tell.
    let mut service = Service::start(&plant);
    let fresh = small_study(1, &["KL"], 1, 6).remove(0);
    plant.put("June run-1.xlsx", &fresh.workbook());
    let again = service.wait_until("the next round", |s| {
        s["rounds"].as_array().map(Vec::len) == Some(3)
    });
    service.stop();
    for broken in &all {
        assert_told_once(broken, &again, &log(&plant));
    }
}

#[test]
fn a_dead_reader_costs_no_workbook() {
    let plant = Plant::new(DESIGN, None);
    let runs = small_study(DESIGN.parts, DESIGN.appraisers, DESIGN.trials, 3);
    let (before, after) = runs.split_at(4);
    let put = |runs: &[Run]| {
        for run in runs {
            plant.put(&format!("{}.xlsx", run.name()), &run.workbook());
        }
    };
    put(before);
    let mut service = Service::start(&plant);
    service.wait_until("the first workbooks", |s| s["readings"]["used"] == 8);
    service.kill_reader();
    put(after);
    let status = service.wait_for_round(1, 1);
    assert_eq!(status["refused"], json!([]));
    assert_eq!(status["readings"]["used"], 24);
    service.stop();
}

/// Exports that no reader can use, and two of which it can use a part or nothing.
fn broken() -> Vec<Broken> {
    let run = Run {
        part: "HP-09".to_owned(),
        taken: time_of(3, 1),
        ..small_study(1, &["KL"], 1, 3).remove(0)
    };
    let workbook = run.workbook();
    let mut junk = noise(4000);
    let mut headed_junk = b"PK\x03\x04".to_vec();
    headed_junk.extend(noise(4000));
    junk[0] = 0x93;
    let text = String::from_utf8(run.text()).expect("text");
    let bridge = |name, bytes, words| Broken {
        folder: "exports/GRR",
        name,
        bytes,
        list: "refused",
        words,
    };
    let cut = xml(1, 1, 0.011);
    vec![
        bridge(
            "cut run-1.xlsx",
            workbook[..workbook.len() / 2].to_vec(),
            &["workbook"],
        ),
        bridge("headed run-1.xlsx", headed_junk, &["workbook"]),
        bridge("empty run-1.xlsx", Vec::new(), &["empty"]),
        bridge("blank run-1.csv", Vec::new(), &["empty"]),
        bridge("junk run-1.csv", junk, &["text"]),
        bridge(
            "column run-1.csv",
            text.replace("Actual", "Current").into_bytes(),
            &["Actual"],
        ),
        Broken {
            list: "set_aside",
            ..bridge(
                "letter run-1.csv",
                run.text_ending_in("18.o3"),
                &["18.o3", "line"],
            )
        },
        Broken {
            folder: "forms",
            ..bridge(
                "cut run-1.xml",
                cut.as_bytes()[..cut.len() * 2 / 3].to_vec(),
                &["line", "the file ends inside"],
            )
        },
    ]
}

fn xml(part: usize, trial: usize, value: f64) -> String {
    format!(
        "<export>\n  <run part=\"C{part}\" trial=\"{trial}\">\n    \
         <feature name=\"seat roundness\"><value>{value}</value></feature>\n  </run>\n</export>\n"
    )
}

/// Bytes without a pattern, always the same (Marsaglia 2003).
fn noise(count: usize) -> Vec<u8> {
    let mut state = 2_463_534_242_u32;
    let mut next = || {
        state ^= state << 13;
        state ^= state >> 17;
        state ^= state << 5;
        state.to_le_bytes()[1]
    };
    (0..count).map(|_| next()).collect()
}

fn entries<'a>(status: &'a Value, list: &str) -> &'a [Value] {
    status[list].as_array().expect("a list")
}

/// One sentence in `status` and the same in one line of the log, with the export's name.
#[track_caller]
fn assert_told_once(broken: &Broken, status: &Value, log: &str) {
    let lists = ["refused", "set_aside"];
    let of = |list| {
        let is_its = |e: &&Value| {
            e["export"]
                .as_str()
                .is_some_and(|e| e.ends_with(broken.name))
        };
        entries(status, list)
            .iter()
            .filter(is_its)
            .collect::<Vec<_>>()
    };
    let found: Vec<&Value> = lists.iter().flat_map(|list| of(list)).collect();
    assert_eq!(
        (found.len(), of(broken.list).len()),
        (1, 1),
        "{}: {found:#?}",
        broken.name
    );
    let sentence = found[0]["reason"].as_str().expect("a sentence");
    assert!(
        (10..300).contains(&sentence.len()),
        "{}: {sentence}",
        broken.name
    );
    assert!(
        !sentence.contains(['\n', '{', '}', '\u{fffd}']),
        "{}: {sentence}",
        broken.name
    );
    for word in broken.words {
        assert!(
            sentence.contains(word),
            "{}: {word} is not in: {sentence}",
            broken.name
        );
    }
    let export = format!("export={}", found[0]["export"]);
    let lines: Vec<&str> = log.lines().filter(|line| line.contains(&export)).collect();
    assert_eq!(lines.len(), 1, "{}: {lines:#?}", broken.name);
    assert!(lines[0].contains("WARN"), "{}", lines[0]);
    assert!(lines[0].contains(sentence), "{}\n{sentence}", lines[0]);
}
