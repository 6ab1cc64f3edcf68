//! Which readings make a run, and what sets one aside.

use crate::shared::{absolute, column, constant, deviation, path, read, read_at, table};
use insta::assert_snapshot;
use restudy_parsers::{Count, Find, Role, Rule, Taken, Trial, Value};

fn features() -> Rule {
    Rule {
        appraiser: Some(column("by")),
        trial: Some(Trial::Stated(column("trial"))),
        characteristic: Some(column("feature")),
        ..table()
    }
}

#[test]
fn one_unusable_reading_sets_its_whole_run_aside_and_no_other() {
    let text = "part,by,trial,feature,value\nP1,KL,1,bore,50.01\nP1,KL,1,slot,12.03.4\nP1,KL,1,pin,\nP2,KL,1,bore,50.02\n";
    assert_snapshot!(read(text, &features()), @"
    run P2 | KL | 1
      bore: 50.02 (line 5, column `value`)
    set aside (3): line 3, column `value`: `12.03.4` is not a number; this instrument's decimal mark is `.` (and 1 further unusable reading in this run)
    ");
}

#[test]
fn a_reading_without_a_label_is_set_aside_alone() {
    let text = "part,by,trial,feature,value\n,KL,1,bore,50.01\nP2,,1,bore,50.02\nP2,KL,1,,50.02\nP3,KL,1,bore,50.02\n";
    assert_snapshot!(read(text, &features()), @"
    run P3 | KL | 1
      bore: 50.02 (line 5, column `value`)
    set aside (1): line 2, column `part`: blank, where the part should stand
      hint: have every row filled in: nothing is taken over from the row above
    set aside (1): line 3, column `by`: blank, where the appraiser should stand
      hint: have every row filled in: nothing is taken over from the row above
    set aside (1): line 4, column `feature`: blank, where the characteristic should stand
      hint: have every row filled in: nothing is taken over from the row above
    ");
}

#[test]
fn a_label_that_fails_for_the_whole_export_is_said_once() {
    let rule = Rule {
        appraiser: Some(crate::shared::at(0, 9)),
        ..table()
    };
    assert_snapshot!(read("part,value\nP1,1\nP1,2\nP2,3\n", &Rule { trial: Some(Trial::Counted(Count::Order)), ..rule }), @"
    set aside (2): line 1, field 10: blank, where the appraiser should stand
      hint: fill the cell in at the instrument, or correct `cell`
    set aside (1): line 1, field 10: blank, where the appraiser should stand
      hint: fill the cell in at the instrument, or correct `cell`
    ");
}

#[test]
fn a_characteristic_twice_is_no_trial_unless_trials_are_counted() {
    let text = "part,value\nP1,50.01\nP1,50.02\nP2,50.03\n";
    assert_snapshot!(read(text, &table()), @"
    run P2
      value: 50.03 (line 4, column `value`)
    set aside (2): line 3, column `value`: `value` occurs twice in one run
      hint: if these are trials, say where the trial stands or how trials are counted
    ");
    let counted = Rule {
        trial: Some(Trial::Counted(Count::Order)),
        ..table()
    };
    assert_snapshot!(read(text, &counted), @"
    run P1 | 1
      value: 50.01 (line 2, column `value`)
    run P1 | 2
      value: 50.02 (line 3, column `value`)
    run P2 | 1
      value: 50.03 (line 4, column `value`)
    ");
}

#[test]
fn an_unusable_value_keeps_its_place_in_the_count_of_trials() {
    let rule = Rule {
        trial: Some(Trial::Counted(Count::Order)),
        ..table()
    };
    assert_snapshot!(read("part,value\nP1,50.01\nP1,---\nP1,50.03\n", &rule), @"
    run P1 | 1
      value: 50.01 (line 2, column `value`)
    run P1 | 3
      value: 50.03 (line 4, column `value`)
    set aside (1): line 3, column `value`: `---` is not a number; this instrument's decimal mark is `.`
      hint: if it means that nothing was measured, list it in `no_value`
    ");
}

#[test]
fn equal_time_stamps_are_a_tie() {
    let rule = Rule {
        trial: Some(Trial::Counted(Count::Taken)),
        taken: Some(Taken {
            role: column("taken"),
            format: None,
            dates: None,
            written_in: None,
            shown_in: None,
        }),
        ..table()
    };
    let text = "part,value,taken\nP1,1,2026-06-02T09:00\nP1,2,2026-06-02T09:00\nP1,3,2026-06-02T09:01\nP1,4,\nP1,5,yesterday\n";
    assert_snapshot!(read(text, &rule), @"
    run P1 | 2026-06-02T09:01:00
      value: 3 (line 4, column `value`)
    set aside (2): line 3, column `value`: `value` occurs twice in one run
      hint: if these are trials, say where the trial stands or how trials are counted
    set aside (1): line 5, column `taken`: blank, where a time as `2026-06-02T14:20:05` should stand
      hint: have the instrument write the time, or correct where `taken` is read
    set aside (1): line 6, column `taken`: `yesterday` is not a time as `2026-06-02T14:20:05`
      hint: have it written so, or say how it is written with `format`
    ");
}

#[test]
fn what_must_stay_the_same_does_so_within_a_run() {
    let rule = Rule {
        same: [("program".to_owned(), column("program"))].into(),
        ..features()
    };
    let text = "part,by,trial,feature,value,program\nP1,KL,1,bore,50.01,rev 12\nP1,KL,1,slot,12.01,rev  13\nP2,KL,1,bore,50.02,rev 12\nP2,KL,1,slot,12.02,rev 12\n";
    assert_snapshot!(read(text, &rule), @"
    run P2 | KL | 1 | same program `rev 12`
      bore: 50.02 (line 4, column `value`)
      slot: 12.02 (line 5, column `value`)
    set aside (2): line 3, column `program`: program is `rev 13` here and `rev 12` before in the same run
      hint: a run keeps it from beginning to end: measure this run again
    ");
}

#[test]
fn no_value_is_never_a_value_but_zero_is_a_nominal() {
    let rule = Rule {
        nominal: Some(column("nominal")),
        upper: deviation(column("tol")),
        no_value: vec!["0".to_owned(), "9999".to_owned(), "---".to_owned()],
        ..table()
    };
    let text = "part,value,nominal,tol\nP1,0.021,0,0.08\nP2,0.000,0,0.08\nP3,9999.0,0,0.08\nP4,---,0,0.08\nP5,0.022,0,---\n";
    assert_snapshot!(read(text, &rule), @"
    run P1
      value: 0.021 [- 0 0.08] (line 2, column `value`)
    run P5
      value: 0.022 [- 0 -] (line 6, column `value`)
    set aside (1): line 3, column `value`: `0.000` stands for no value
      hint: measure this run again
    set aside (1): line 4, column `value`: `9999.0` stands for no value
      hint: measure this run again
    set aside (1): line 5, column `value`: `---` stands for no value
      hint: measure this run again
    ");
}

#[test]
fn limits_are_absent_deviations_or_wrong() {
    let rule = Rule {
        nominal: Some(column("nominal")),
        lower: deviation(column("low")),
        upper: deviation(column("up")),
        ..table()
    };
    let text = "part,value,nominal,low,up\nP1,50,50,-0.05,0.05\nP2,50,50,,0.05\nP3,50,,,0.05\nP4,50,50,0.1,-0.1\nP5,50,50,n/a,0.1\nP6,0.1,0.1,0,0.2\n";
    assert_snapshot!(read(text, &rule), @r#"
    run P1
      value: 50 [49.95 50 50.05] (line 2, column `value`)
    run P2
      value: 50 [- 50 50.05] (line 3, column `value`)
    run P6
      value: 0.1 [0.1 0.1 0.3] (line 7, column `value`)
    set aside (1): line 4, column `up`: the upper limit is taken from the nominal, which is blank
      hint: fill in the nominal, or leave `from` out if the limit is absolute
    set aside (1): line 5, column `low`: the lower limit 50.1 lies above the upper limit 49.9
      hint: are the limits signed deviations (`from = "nominal"`), or exchanged?
    set aside (1): line 6, column `low`: `n/a` is not a number; this instrument's decimal mark is `.`
      hint: if it means that nothing was measured, list it in `no_value`
    "#);
}

#[test]
fn a_constant_of_the_rule_is_written_with_a_point_whatever_the_export_writes() {
    let rule = Rule {
        lower: absolute(constant("49.95")),
        decimal: ',',
        ..table()
    };
    assert_snapshot!(read("part;value\nP1;50,01\n", &rule), @"
    run P1
      value: 50.01 [49.95 - -] (line 2, column `value`)
    ");
}

#[test]
fn a_missing_end_makes_every_run_incomplete() {
    let rule = Rule {
        end: Some(Find {
            find: "end of report".to_owned(),
        }),
        ..table()
    };
    assert_snapshot!(read("part,value\nP1,1\nP2,x\nP3,3\n", &rule), @"
    set aside (1): end of the export: the text `end of report` is missing, so the run is incomplete
      hint: a run that was broken off looks like this: measure it again
    set aside (1): line 3, column `value`: `x` is not a number; this instrument's decimal mark is `.`
      hint: if it means that nothing was measured, list it in `no_value`
    set aside (1): end of the export: the text `end of report` is missing, so the run is incomplete
      hint: a run that was broken off looks like this: measure it again
    ");
    assert_snapshot!(read("part,value\nP1,1\n\n-- End of  REPORT --\nP2,2,3,4\n", &rule), @"
    run P1
      value: 1 (line 2, column `value`)
    ");
}

#[test]
fn lines_that_do_not_fit_the_headings_are_set_aside() {
    let text = "part,by,trial,feature,value,,\nP1,KL,1,bore,50,01,mm,x\nP2,KL,1,bore\nP3,KL,1,bore,50.01\n\n ,,\nP4,KL,1,bore,50.01,,\n";
    assert_snapshot!(read(text, &features()), @"
    run P3 | KL | 1
      bore: 50.01 (line 4, column `value`)
    run P4 | KL | 1
      bore: 50.01 (line 7, column `value`)
    set aside (1): line 2, field 5: 8 fields below 5 headings
      hint: does a decimal comma or a text part the fields as well?
    set aside (1): line 3, field 4: only 4 fields below 5 headings
      hint: was the line cut short? export it again
    ");
}

#[test]
fn units_and_texts_are_taken_apart_by_a_regex() {
    let find = |role: Role, regex: &str| Role {
        find: Some(regex.to_owned()),
        ..role
    };
    let rule = Rule {
        part: find(path(r"hub-(\w+)"), r"\d+"),
        value: Value {
            role: find(column("value"), r"^\S+"),
            unit: Some(find(column("value"), r"\S+$")),
        },
        trial: Some(Trial::Counted(Count::Order)),
        ..table()
    };
    assert_snapshot!(read_at("GRR/hub-P07/a.csv", "value\n50.01 mm\n50.02 µm\n", &rule), @"
    run 07 | 1
      value: 50.01 mm (line 2, column `value`)
    run 07 | 2
      value: 50.02 µm (line 3, column `value`)
    ");
    assert_snapshot!(read_at("GRR/hub-x/a.csv", "value\n50.01 mm\n", &rule), @r#"
    set aside (1): the export's path: nothing in `x` matches `\d+`, where the part should stand
      hint: have it written as before, or correct `find`
    "#);
}

#[test]
fn an_export_without_columns_is_one_reading() {
    let rule = Rule {
        part: crate::shared::label("Part:"),
        value: Value {
            role: crate::shared::label("Result"),
            unit: Some(crate::shared::at(1, 2)),
        },
        ..table()
    };
    assert_snapshot!(read("Part:,,P 7\nResult,50.01,mm\n", &rule), @"
    run P 7
      value: 50.01 mm (line 2, field 2)
    ");
}
