//! `restudy analyse` on designs beyond part × appraiser: further factors, nested factors, the part alone.

use std::process::Output;

use serde_json::{Value, json as value};
use tempfile::TempDir;

use crate::program::{json, restudy, text};
use crate::published::{self, assert_agrees, line};
use crate::record_keys::assert_one_off;

const DIGITS: i32 = 10;
/// Digits of confidence limits.
const LIMIT_DIGITS: i32 = 8;

struct Table {
    folder: TempDir,
}

impl Table {
    fn of(content: &str) -> Self {
        let folder = tempfile::tempdir().expect("a temporary folder");
        fs_err::write(folder.path().join("study.csv"), content).expect("a file can be written");
        Self { folder }
    }

    /// The published readings, their lines changed.
    fn from_published(name: &str, change: &dyn Fn(&str) -> Option<String>) -> Self {
        let content = fs_err::read_to_string(published::path(&format!("{name}.csv")));
        let content = content.expect("a fixture");
        let lines: Vec<String> = content.lines().filter_map(change).collect();
        Self::of(&lines.join("\n"))
    }

    fn analysed(&self, options: &[&str]) -> Output {
        let file = self.folder.path().join("study.csv");
        let line = ["analyse", file.to_str().expect("a plain path")];
        restudy(&[&line, options].concat())
    }

    #[track_caller]
    fn record(&self, options: &[&str]) -> Value {
        let output = self.analysed(&[options, &["--json"]].concat());
        assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
        json(&output)[0].clone()
    }

    /// Standard error of a study that could not be worked out, or was asked for in vain.
    #[track_caller]
    fn refused(&self, options: &[&str], code: i32) -> String {
        let output = self.analysed(options);
        let said = text(&output.stderr);
        assert_eq!(output.status.code(), Some(code), "{said}");
        said
    }
}

fn unchanged(line: &str) -> Option<String> {
    Some(line.to_owned())
}

#[track_caller]
fn assert_says(said: &str, sentences: &[&str]) {
    for sentence in sentences {
        assert!(said.contains(sentence), "`{sentence}` is not in:\n{said}");
    }
}

/// Checks a record against reference values whose terms go by other names.
#[track_caller]
fn assert_is_published(record: &Value, name: &str, terms: &[(&str, &str)]) {
    let values = published::values(name);
    assert_one_off(record);
    assert_eq!(
        record["mean_squares"].as_array().map(Vec::len),
        Some(terms.len() + 1),
        "the terms and the total"
    );
    for (term, published) in terms {
        let what = format!("{name}, {term}");
        let (line, published) = (line(record, term), &values["anova"][published]);
        for key in ["ss", "df", "ms"] {
            assert_agrees(&line[key], &published[key], DIGITS, &what);
        }
        if *term != "within cells" {
            assert_agrees(&line["f"], &published["f"], DIGITS, &what);
            assert_agrees(&line["p"], &published["p"], DIGITS, &what);
        }
    }
    let (estimates, limits) = (
        &values["model"]["estimates"],
        &values["model"]["intervals"]["0.95"]["mls"],
    );
    for figure in ["repeatability", "reproducibility", "gauge", "part", "total"] {
        let (found, what) = (&record["figures"][figure], format!("{name}, {figure}"));
        let expected = &estimates["variance"][figure]["truncated"];
        assert_agrees(&found["variance"]["estimate"], expected, DIGITS, &what);
        let expected = &estimates["share_of_tolerance"]["6"][figure];
        let share = &found["share_of_tolerance"]["estimate"];
        if !share.is_null() {
            assert_agrees(share, expected, DIGITS, &what);
        }
        if ["mls", "exact"]
            .map(Value::from)
            .contains(&found["variance"]["interval"])
        {
            for side in ["lower", "upper"] {
                let expected = &limits[figure][side];
                assert_agrees(&found["variance"][side], expected, LIMIT_DIGITS, &what);
            }
        }
    }
    let share = &record["figures"]["gauge"]["share_of_tolerance"]["estimate"];
    assert!(share.is_f64(), "{share}");
}

const PARTS_IN_APPRAISERS: [(&str, &str); 3] = [
    ("appraiser", "appraiser"),
    ("part within appraiser", "part(appraiser)"),
    ("within cells", "error"),
];
const NESTED: [&str; 6] = [
    "--within",
    "part=appraiser",
    "--lower",
    "220",
    "--upper",
    "260",
];

#[test]
fn parts_within_appraisers_whatever_their_labels() {
    let labelled_apart = Table::from_published("f_nested_3x8x3", &unchanged);
    let record = labelled_apart.record(&NESTED);
    assert_is_published(&record, "f_nested_3x8x3", &PARTS_IN_APPRAISERS);
    assert_eq!(
        record["design"]["factors"],
        value!([
            { "name": "part", "levels": 8, "within": ["appraiser"] },
            { "name": "appraiser", "levels": 3, "within": [] },
        ])
    );
    let component = &record["components"][1];
    assert_eq!(component["name"], "part within appraiser");
    assert_eq!(component["within"], value!(["appraiser"]));

    // `A1`, `B1`, `C1` become `1` each.
    let reused = |line: &str| Some(line.trim_start_matches(['A', 'B', 'C']).to_owned());
    let reused = Table::from_published("f_nested_3x8x3", &reused);
    let same = reused.record(&NESTED);
    assert_eq!(same["mean_squares"], record["mean_squares"]);
    assert_eq!(same["figures"], record["figures"]);

    let output = labelled_apart.analysed(&NESTED);
    assert_says(
        &text(&output.stdout),
        &["value: 3 appraisers × 8 parts within each appraiser × 3 trials, 72 readings"],
    );
    assert!(!text(&output.stdout).contains("interaction"));
}

#[test]
fn a_remark_names_the_part_of_its_container() {
    let slip = |line: &str| {
        let relabelled = line.replacen("B3,", "b-3,", 1);
        let is_slip = relabelled.starts_with("b-3,B,2,");
        Some(if is_slip {
            "b-3,B,2,275.1".to_owned()
        } else {
            relabelled
        })
    };
    let record = Table::from_published("f_nested_3x8x3", &slip).record(&NESTED);
    let remarks = record["remarks"].as_array().expect("remarks");
    assert!(
        remarks.iter().any(|r| r["text"]
            .as_str()
            .is_some_and(|t| t.starts_with("b-3 B repeats worse"))),
        "{remarks:?}"
    );
}

#[test]
fn the_handbooks_operators_within_machines() {
    let table = Table::from_published("c_nist_nested_5x2x5", &unchanged);
    let tolerance = ["--lower", "0.115", "--upper", "0.135"];
    let record = table.record(&[&tolerance[..], &["--within", "Appraiser=PART"]].concat());
    let terms = [
        ("part", "part"),
        ("appraiser within part", "appraiser(part)"),
        ("within cells", "error"),
    ];
    assert_is_published(&record, "c_nist_nested_5x2x5", &terms);
}

#[test]
fn a_third_factor_from_a_column() {
    let terms = |word: &str| {
        let names = [
            "part",
            "appraiser",
            "fixture",
            "part*appraiser",
            "part*fixture",
            "appraiser*fixture",
            "part*appraiser*fixture",
        ];
        let ours = |name: &str| name.replace('*', " × ").replace("fixture", word);
        let mut terms: Vec<(String, &str)> = names.map(|name| (ours(name), name)).to_vec();
        terms.push(("within cells".to_owned(), "error"));
        terms
    };
    let table = Table::from_published("f_three_factor_8x3x2x2", &unchanged);
    let tolerance = ["--lower", "24.85", "--upper", "25.15"];
    for (option, word) in [("Fixture", "Fixture"), ("clamp = fixture", "clamp")] {
        let record = table.record(&[&tolerance[..], &["--factor", option]].concat());
        let terms = terms(word);
        let terms: Vec<(&str, &str)> = terms.iter().map(|(o, t)| (o.as_str(), *t)).collect();
        assert_is_published(&record, "f_three_factor_8x3x2x2", &terms);
        assert_eq!(
            record["design"]["factors"][2],
            value!({ "name": word, "levels": 2, "within": [] })
        );
    }
    let said = text(&table.analysed(&["--factor", "fixture"]).stdout);
    assert_says(
        &said,
        &[
            "value: 8 parts × 3 appraisers × 2 fixtures × 2 trials, 96 readings",
            "AV holds appraiser, fixture, part × appraiser",
        ],
    );
}

/// One-way certified values: the treatment stands for the part, nobody for the appraiser.
#[test]
fn the_part_alone() {
    let name = "d_strd_SiRstv";
    let values = published::values(name);
    let table = Table::from_published(name, &unchanged);
    let record = table.record(&[]);
    assert_eq!(
        record["design"]["factors"].as_array().map(Vec::len),
        Some(1)
    );
    for (term, certified) in [("part", "between"), ("within cells", "within")] {
        for key in ["ss", "df", "ms"] {
            let certified = values["certified"][certified][key].as_str();
            let certified: f64 = certified.and_then(|x| x.parse().ok()).expect("a number");
            assert_agrees(&line(&record, term)[key], &value!(certified), DIGITS, term);
        }
    }
    let said = text(&table.analysed(&[]).stdout);
    assert_says(
        &said,
        &["Only the part is in the design: there is no AV, and GRR is EV."],
    );
    assert!(!said.contains("appraiser"), "{said}");
}

/// Repeats of the part are then all readings of it: the sums of squares of its own line stay.
#[test]
fn the_appraiser_left_out() {
    let values = published::values("a_aiag_10x3x3");
    let table = Table::from_published("a_aiag_10x3x3", &unchanged);
    let record = table.record(&["--leave-out", "appraiser"]);
    assert_eq!(record["design"]["trials"], 9);
    let part = line(&record, "part");
    assert_agrees(&part["ss"], &values["anova"]["part"]["ss"], DIGITS, "part");
    let anova = &values["anova"];
    let rest: f64 = ["appraiser", "interaction", "error"]
        .iter()
        .map(|term| anova[term]["ss"].as_f64().expect("a sum of squares"))
        .sum();
    let within = &line(&record, "within cells")["ss"];
    assert_agrees(within, &value!(rest), DIGITS, "within cells");
    let output = table.analysed(&["--leave-out", "appraiser"]);
    assert_says(
        &text(&output.stderr),
        &["appraiser is left out of the design; what it adds counts as repeatability"],
    );

    let only_b = |line: &str| {
        (line.starts_with("part") || line.split(',').nth(1) == Some("B")).then(|| line.to_owned())
    };
    let output = Table::from_published("a_aiag_10x3x3", &only_b).analysed(&[]);
    assert_eq!(output.status.code(), Some(0));
    assert_says(&text(&output.stderr), &["appraiser is `B` throughout"]);
}

#[test]
fn labels_that_show_a_nested_design_are_not_taken_as_crossed() {
    let table = Table::from_published("f_nested_3x8x3", &unchanged);
    assert_says(
        &table.refused(&[], 1),
        &[
            "value: every part appears under one appraiser only, so that a crossed design would have empty cells",
            "hint: if that was the plan, say --within part=appraiser",
        ],
    );
    let twins = "part,appraiser,rig,value\n1,A,L,1\n1,B,R,2\n2,A,L,3\n2,B,R,5\n1,A,L,1\n1,B,R,3\n2,A,L,4\n2,B,R,5\n";
    assert_says(
        &Table::of(twins).refused(&["--factor", "rig"], 1),
        &["appraiser and rig change together", "--leave-out rig"],
    );
    let one_each = "part,rig,value\n1,a,1\n1,a,2\n2,b,3\n2,b,5\n3,c,3\n3,c,4\n";
    assert_says(
        &Table::of(one_each).refused(&["--factor", "rig", "--within", "rig=part"], 1),
        &["there is one rig within each part"],
    );
}

#[test]
fn containers_with_unequal_numbers_are_told() {
    let without_c8 = |line: &str| (!line.starts_with("C8,")).then(|| line.to_owned());
    let table = Table::from_published("f_nested_3x8x3", &without_c8);
    let output = table.analysed(&[&NESTED[..], &["--json"]].concat());
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    assert_says(
        &text(&output.stderr),
        &["the levels of part differ in number, 8 within appraiser A and 7 within appraiser C"],
    );
    assert_eq!(json(&output)[0]["method"], "reml");
}

#[test]
fn options_that_no_design_could_follow() {
    let table = Table::from_published("a_aiag_10x3x3", &unchanged);
    let cases: [(&[&str], &[&str]); 10] = [
        (
            &["--within", "part=operator"],
            &[
                "there is no factor `operator`; the factors are part, appraiser",
                "--factor",
            ],
        ),
        (
            &["--within", "part=part"],
            &["`part` ends up within itself"],
        ),
        (
            &["--within", "part=appraiser", "--within", "appraiser=part"],
            &["ends up within itself"],
        ),
        (&["--within", "part"], &["FACTOR=CONTAINER"]),
        (
            &["--factor", "Trial"],
            &["the column `Trial` has a meaning of its own"],
        ),
        (&["--factor", "appraiser"], &["in the design already"]),
        (
            &["--factor", "fixture", "--factor", "clamp=fixture"],
            &["in the design already"],
        ),
        (&["--leave-out", "part"], &["cannot do without the part"]),
        (
            &["--fixed", "fixture"],
            &[
                "all factors are random here",
                "need methods that this program does not have",
            ],
        ),
        (&["--fixed=fixture"], &["fixture cannot be taken as fixed"]),
    ];
    for (options, sentences) in cases {
        assert_says(&table.refused(options, 2), sentences);
    }
    assert_says(
        &table.refused(&["--factor", "clamp"], 1),
        &["no column is headed `clamp`"],
    );
}
