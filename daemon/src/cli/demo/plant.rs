//! Halden Pump Works: an invented plant, its configuration, and the exports of its machine.
//!
//! The readings are drawn with a fixed seed from stated standard deviations, so that every demo says the same.

use std::path::{Path, PathBuf};

use jiff::civil::{DateTime, date};
use jiff::{Span, ToSpan as _};
use rust_xlsxwriter::Workbook;

/// Who would get the alert.
pub(super) const RECIPIENT: &str = "quality@halden.example";

const CONFIG: &str = r#"# An invented plant; every value is made up.
[site]
name = "Halden Pump Works"
zone = "Europe/Oslo"

[state]
folder = "state"

[[instrument]]
name    = "bridge-1"
folders = ["exports"]
files   = ["*.xlsx"]
settle  = "500ms"
rescan  = "2s"

[instrument.read]
form           = "table"
sheet          = "Results"
header         = { find = "Serial no." }
decimal        = "."
part           = { column = "Serial no." }
appraiser      = { label = "Loaded by" }
trial          = { path = 'run-(\d+)' }
taken          = { label = "Measured", format = "%Y-%m-%d %H:%M" }
characteristic = { column = "Feature" }
value          = { column = "Actual", unit = "mm" }
nominal        = { column = "Nominal" }
lower          = { column = "Lower tol.", from = "nominal" }
upper          = { column = "Upper tol.", from = "nominal" }
same           = { program = { label = "Program" }, stylus = { label = "Stylus" } }

[[plan]]
name           = "impeller hub"
instruments    = ["bridge-1"]
only           = { path = "GRR" }
parts          = 10
appraisers     = ["KL", "MO", "TS"]
appraiser_word = "loading"
trials         = 3
interaction    = "keep"
finish_within  = "5d"
repeat_every   = "90d"

[plan.limits]
watch = 0.10
act   = 0.30

# Without a mail server notices are logged. With one:
# [mail]
# server = "mail.halden.example"
# tls    = "starttls"
# from   = "Restudy <restudy@halden.example>"
# [[route]]
# to = ["quality@halden.example"]
"#;

const PARTS: usize = 10;
const LOADINGS: [&str; 3] = ["KL", "MO", "TS"];
const TRIALS: usize = 3;
const SEED: u64 = 20_260_301;

/// A characteristic of the hub; all in mm.
struct Feature {
    name: &'static str,
    nominal: f64,
    tolerance: f64,
    part_sd: f64,
    repeat_sd: f64,
    loading_sd: f64,
    /// How far TS's loadings shift it in the second round.
    shift: f64,
}

const FEATURES: [Feature; 4] = [
    Feature {
        name: "bore A",
        nominal: 50.0,
        tolerance: 0.0135,
        part_sd: 0.0041,
        repeat_sd: 0.00035,
        loading_sd: 0.0001,
        shift: 0.0026,
    },
    Feature {
        name: "height B",
        nominal: 18.0,
        tolerance: 0.05,
        part_sd: 0.014,
        repeat_sd: 0.0011,
        loading_sd: 0.0005,
        shift: 0.0031,
    },
    Feature {
        name: "face C runout",
        nominal: 0.05,
        tolerance: 0.04,
        part_sd: 0.009,
        repeat_sd: 0.0009,
        loading_sd: 0.0003,
        shift: 0.0,
    },
    Feature {
        name: "slot width",
        nominal: 6.0,
        tolerance: 0.09,
        part_sd: 0.017,
        repeat_sd: 0.0009,
        loading_sd: 0.0003,
        shift: 0.0,
    },
];

/// One export: one run.
pub(super) struct Export {
    name: PathBuf,
    part: String,
    loading: &'static str,
    taken: DateTime,
    values: Vec<f64>,
}

/// Makes the folders and the configuration; answers with the configuration's path.
pub(super) fn build(folder: &Path) -> std::io::Result<PathBuf> {
    fs_err::create_dir_all(folder.join("exports/GRR"))?;
    fs_err::create_dir_all(folder.join("state"))?;
    let path = folder.join("restudy.toml");
    fs_err::write(&path, CONFIG)?;
    Ok(path)
}

/// Both rounds' exports, in the order in which they arrive.
pub(super) fn exports() -> Vec<Export> {
    let mut chance = Chance(SEED);
    let parts: Vec<Vec<f64>> = (0..PARTS)
        .map(|_| {
            FEATURES
                .iter()
                .map(|f| f.nominal + f.part_sd * chance.normal())
                .collect()
        })
        .collect();
    let habits: Vec<Vec<f64>> = LOADINGS
        .iter()
        .map(|_| {
            FEATURES
                .iter()
                .map(|f| f.loading_sd * chance.normal())
                .collect()
        })
        .collect();
    let mut exports = Vec::new();
    for (round, start) in [(1, date(2026, 3, 2)), (2, date(2026, 6, 1))] {
        let mut taken = start.at(7, 30, 0, 0);
        for trial in 1..=TRIALS {
            for (l, loading) in LOADINGS.iter().enumerate() {
                for (p, part) in parts.iter().enumerate() {
                    let shifted = round == 2 && *loading == "TS";
                    let values = FEATURES.iter().enumerate().map(|(f, feature)| {
                        let shift = if shifted { feature.shift } else { 0.0 };
                        let value =
                            part[f] + habits[l][f] + shift + feature.repeat_sd * chance.normal();
                        (value * 1e5).round() / 1e5
                    });
                    exports.push(Export {
                        name: format!(
                            "GRR/round-{round}/hub-{:02} {loading} run-{trial}.xlsx",
                            p + 1
                        )
                        .into(),
                        part: format!("hub-{:02}", p + 1),
                        loading,
                        taken,
                        values: values.collect(),
                    });
                    taken = later(taken, 9.minutes());
                }
            }
        }
    }
    exports
}

fn later(at: DateTime, span: Span) -> DateTime {
    at.checked_add(span).unwrap_or(at)
}

impl Export {
    /// Writes the workbook beside its place and moves it there, as careful exporters do.
    pub(super) fn write(&self, folder: &Path) -> Result<(), String> {
        let place = folder.join("exports").join(&self.name);
        let parent = place.parent().unwrap_or(folder);
        fs_err::create_dir_all(parent).map_err(|e| e.to_string())?;
        let temporary = place.with_extension("part");
        let bytes = self.workbook().map_err(|e| e.to_string())?;
        fs_err::write(&temporary, bytes).map_err(|e| e.to_string())?;
        fs_err::rename(&temporary, &place).map_err(|e| e.to_string())
    }

    fn workbook(&self) -> Result<Vec<u8>, rust_xlsxwriter::XlsxError> {
        let mut workbook = Workbook::new();
        let sheet = workbook.add_worksheet().set_name("Results")?;
        let head = [
            ("Halden Pump Works", String::new()),
            ("Loaded by", self.loading.to_owned()),
            (
                "Measured",
                self.taken.strftime("%Y-%m-%d %H:%M").to_string(),
            ),
            ("Program", "hub rev 12".to_owned()),
            ("Stylus", "ST-20".to_owned()),
        ];
        for (row, (label, value)) in (0..).zip(&head) {
            sheet.write_string(row, 0, *label)?;
            if !value.is_empty() {
                sheet.write_string(row, 1, value)?;
            }
        }
        let headings = [
            "Serial no.",
            "Feature",
            "Nominal",
            "Lower tol.",
            "Upper tol.",
            "Actual",
        ];
        for (column, heading) in (0..).zip(headings) {
            sheet.write_string(6, column, heading)?;
        }
        for ((row, feature), value) in (7..).zip(&FEATURES).zip(&self.values) {
            sheet.write_string(row, 0, &self.part)?;
            sheet.write_string(row, 1, feature.name)?;
            let numbers = [
                feature.nominal,
                -feature.tolerance,
                feature.tolerance,
                *value,
            ];
            for (column, number) in (2..).zip(numbers) {
                sheet.write_number(row, column, number)?;
            }
        }
        workbook.save_to_buffer()
    }
}

/// A small seeded source of chance (SplitMix64, Steele, Lea & Flood 2014); for the demo's readings only.
struct Chance(u64);

impl Chance {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Box and Muller 1958.
    fn normal(&mut self) -> f64 {
        let radius = (-2.0 * (1.0 - self.uniform()).ln()).sqrt();
        radius * (std::f64::consts::TAU * self.uniform()).cos()
    }
}
