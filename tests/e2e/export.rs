//! The exports of an invented bridge machine: one file a run, as a workbook or as delimited text.

use jiff::ToSpan as _;
use jiff::civil::{DateTime, date};
use rust_xlsxwriter::{DocProperties, ExcelDateTime, Workbook, XlsxError};

/// One part measured once by one appraiser.
#[derive(Debug, Clone)]
pub(crate) struct Run {
    pub(crate) part: String,
    pub(crate) appraiser: String,
    pub(crate) trial: usize,
    pub(crate) taken: DateTime,
    pub(crate) program: String,
    pub(crate) features: Vec<Feature>,
}

/// One measured feature; the limits are deviations from the nominal.
#[derive(Debug, Clone)]
pub(crate) struct Feature {
    pub(crate) name: &'static str,
    pub(crate) nominal: f64,
    pub(crate) deviation: f64,
    pub(crate) value: f64,
}

const HEADINGS: [&str; 6] = [
    "Serial no.",
    "Feature",
    "Nominal",
    "Lower tol.",
    "Upper tol.",
    "Actual",
];

/// When the `n`-th run of a study that starts in that month is measured: nine minutes a run.
pub(crate) fn time_of(month: i8, n: usize) -> DateTime {
    let minutes = i64::try_from(n).expect("few runs") * 9;
    date(2026, month, 2)
        .at(7, 30, 0, 0)
        .checked_add(minutes.minutes())
        .expect("a time this century")
}

impl Run {
    /// The file's name without its ending; the trial stands nowhere else.
    pub(crate) fn name(&self) -> String {
        format!("{} {} run-{}", self.part, self.appraiser, self.trial)
    }

    fn head(&self) -> [(&'static str, String); 4] {
        [
            ("Halden Pump Works", String::new()),
            ("Loaded by", self.appraiser.clone()),
            (
                "Measured",
                self.taken.strftime("%Y-%m-%d %H:%M").to_string(),
            ),
            ("Program", self.program.clone()),
        ]
    }

    pub(crate) fn workbook(&self) -> Vec<u8> {
        self.try_workbook().expect("a workbook can be made")
    }

    fn try_workbook(&self) -> Result<Vec<u8>, XlsxError> {
        let mut workbook = Workbook::new();
        // Otherwise the time at which it is made: equal runs are to have equal bytes.
        let made = ExcelDateTime::from_ymd(2026, 3, 2)?;
        workbook.set_properties(&DocProperties::new().set_creation_datetime(&made));
        let sheet = workbook.add_worksheet().set_name("Results")?;
        for (row, (label, value)) in (0..).zip(&self.head()) {
            sheet.write_string(row, 0, *label)?;
            sheet.write_string(row, 1, value)?;
        }
        for (column, heading) in (0..).zip(HEADINGS) {
            sheet.write_string(5, column, heading)?;
        }
        for (row, feature) in (6..).zip(&self.features) {
            sheet.write_string(row, 0, &self.part)?;
            sheet.write_string(row, 1, feature.name)?;
            let numbers = [
                feature.nominal,
                -feature.deviation,
                feature.deviation,
                feature.value,
            ];
            for (column, number) in (2..).zip(numbers) {
                sheet.write_number(row, column, number)?;
            }
        }
        workbook.save_to_buffer()
    }

    pub(crate) fn text(&self) -> Vec<u8> {
        let mut lines: Vec<String> = self
            .head()
            .iter()
            .map(|(label, value)| format!("{label},{value}"))
            .collect();
        lines.push(String::new());
        lines.push(HEADINGS.join(","));
        lines.extend(self.features.iter().map(|f| {
            format!(
                "{},{},{},{},{},{}",
                self.part, f.name, f.nominal, -f.deviation, f.deviation, f.value
            )
        }));
        lines.join("\r\n").into_bytes()
    }

    /// Delimited text whose last value reads otherwise.
    pub(crate) fn text_ending_in(&self, value: &str) -> Vec<u8> {
        let text = self.text();
        let comma = text
            .iter()
            .rposition(|byte| *byte == b',')
            .expect("several fields");
        [&text[..=comma], value.as_bytes()].concat()
    }
}

/// The runs of a small study in the order in which they are measured, two features each; every value is made up,
/// with a gauge that takes about a quarter of the tolerance of `bore A` and little of that of `height B`.
pub(crate) fn small_study(parts: usize, appraisers: &[&str], trials: usize, month: i8) -> Vec<Run> {
    let mut runs = Vec::new();
    for trial in 1..=trials {
        for (a, appraiser) in appraisers.iter().enumerate() {
            for part in 1..=parts {
                let habit = a as f64 * 0.002;
                let scatter = ((7 * part + 5 * a + 3 * trial) % 5) as f64 * 0.001 - 0.002;
                let size = part as f64 * 0.006;
                runs.push(Run {
                    part: format!("HP-{part:02}"),
                    appraiser: (*appraiser).to_owned(),
                    trial,
                    taken: time_of(month, runs.len()),
                    program: "hub rev 12".to_owned(),
                    features: vec![
                        feature("bore A", 50.0, 0.03, 50.0 + size + habit + scatter),
                        feature("height B", 18.0, 0.5, 18.0 + 5.0 * size + scatter),
                    ],
                });
            }
        }
    }
    runs
}

fn feature(name: &'static str, nominal: f64, deviation: f64, value: f64) -> Feature {
    Feature {
        name,
        nominal,
        deviation,
        value,
    }
}
