//! `[[plan]]`: the planned design, its limits and its characteristics.

use restudy_engine::{Judge, Limits};

use crate::checked::{Appraisers, Characteristic, Plan, PlanFactor};
use crate::duration::duration;
use crate::folders::Folders;
use crate::place::regex;
use crate::source::{Place, Source, shortened};
use crate::tables::instrument::{Instruments, unique};
use crate::tables::judging::{INTERACTION, interaction, limits, process};
use crate::tables::levels::{count, levels};
use crate::tables::plan_instruments::{fits, reached};
use crate::tables::{characteristic, list};
use crate::walk::{Node, Table};
use restudy_parsers::{fold, nearest};

/// Runs of one round at most; bounds memory, run time and the length of a report.
const RUNS_MAX: usize = 10_000;

/// The plans as far as they could be read.
#[derive(Debug, Default)]
pub(crate) struct Plans {
    /// Every name that is written, of faulty ones too.
    pub(crate) names: Vec<String>,
    /// Those without a fault of their own.
    pub(crate) checked: Vec<Plan>,
}

pub(crate) fn plans(
    root: &Table<'_>,
    instruments: Option<&Instruments>,
    folders: &Folders<'_>,
) -> Option<Plans> {
    let node = root.need("plan", "at least one [[plan]] table")?;
    let mut plans = Plans::default();
    for table in node.tables("plan", &root.place)? {
        let Some((plan, factors)) = plan(&table, instruments, folders, &mut plans.names) else {
            continue;
        };
        for name in &plan.instruments {
            if let Some(instrument) = instruments.and_then(|all| {
                all.checked
                    .iter()
                    .find(|instrument| instrument.name == *name)
            }) {
                fits(&table, &plan, &factors, instrument);
            }
        }
        reached(&table, &plan, &plans.checked);
        plans.checked.push(plan);
    }
    Some(plans)
}

/// The plan, and where each of its factors stands.
fn plan<'a>(
    table: &Table<'a>,
    instruments: Option<&Instruments>,
    folders: &Folders<'_>,
    names: &mut Vec<String>,
) -> Option<(Plan, Vec<Place<'a>>)> {
    let name = table
        .need("name", "the plan's name")
        .and_then(|node| unique(&node, names));
    let used = table
        .need("instruments", "a list of instrument names")
        .and_then(|node| used(&node, instruments));
    let only = table.optional("only", only);
    let parts = table
        .need("parts", "a number of parts, or a list of their names")
        .and_then(|node| levels(&node, 2, "a number of parts"));
    let appraisers = table.optional("appraisers", |node| appraisers(node, table));
    if let (None, Some(word)) = (table.get("appraisers"), table.get("appraiser_word")) {
        word.fault_hint(
            "`appraisers` beside it",
            "without appraisers there is nothing to call so",
        );
    }
    let trials = table
        .need("trials", "a number of trials")
        .and_then(|node| trials(&node));
    let factors = factors(table);
    let hint = "it changes results, so it has no default";
    let interaction = table
        .need_hint("interaction", INTERACTION, hint)
        .and_then(|node| interaction(&node));
    let spread = "a number of standard deviations above 0 and up to 20, such as 6";
    let spread_sds = table.or("spread_sds", 6.0, |node| {
        node.number(|sds| sds > 0.0 && sds <= 20.0, spread)
    });
    let confidence = table.or("confidence", 0.95, |node| confidence(node));
    let finish_within = table.optional("finish_within", |node| duration(node, "1s", "3660d"));
    let repeat_every = table.optional("repeat_every", |node| duration(node, "1s", "3660d"));
    let judging = table
        .need("limits", "a [plan.limits] table with watch and act")
        .and_then(|node| limits(&node.table("a [plan.limits] table")?));
    let process = table.optional("process", process);
    let characteristics = characteristics(table, judging, process.flatten(), folders);
    table.later(&[
        "calendar",
        "baseline",
        "remind",
        "temperature",
        "run_sheet",
        "guard_band",
        "owner",
        "gauge",
    ]);
    table.finish();

    let (limits, judge) = judging?;
    let (factors, factor_places): (Vec<_>, Vec<_>) = factors?.into_iter().unzip();
    let plan = Plan {
        name: name?.to_owned(),
        instruments: used?,
        only: only?,
        parts: parts?,
        appraisers: appraisers?,
        trials: trials?,
        factors,
        interaction: interaction?,
        spread_sds: spread_sds?,
        confidence: confidence?,
        finish_within: finish_within?,
        repeat_every: repeat_every?,
        limits,
        judge,
        process: process?,
        characteristics: characteristics?,
        whole_list: table.get("characteristics").is_some(),
    };
    bounded(&table.place, &plan)?;
    apart(table, &plan, &factor_places);
    Some((plan, factor_places))
}

fn used(node: &Node<'_>, instruments: Option<&Instruments>) -> Option<Vec<String>> {
    let names = node.names("a list of instrument names")?;
    if let Some(instruments) = instruments {
        for (name, node) in &names {
            if !instruments.names.iter().any(|other| other == name) {
                let close = nearest(name, instruments.names.iter().map(String::as_str));
                node.place
                    .fault_nearest(node.found(), "the name of an [[instrument]]", close);
            }
        }
    }
    Some(names.into_iter().map(|(name, _)| name.to_owned()).collect())
}

fn only(node: &Node<'_>) -> Option<regex::Regex> {
    let table = node.table("a table such as { path = \"GRR\" }")?;
    let path = table
        .need("path", "a regular expression for the export's path")
        .and_then(|node| regex(&node, usize::MAX));
    table.finish();
    path
}

fn appraisers(node: &Node<'_>, table: &Table<'_>) -> Option<Appraisers> {
    let levels = levels(node, 1, "a number of appraisers");
    let word = table.or("appraiser_word", "appraiser", |node| node.name());
    let levels = levels?;
    if count(&levels) == 1 {
        node.place.warn(
            "one appraiser",
            "two or more",
            "with one, differences between appraisers stay unseen",
        );
    }
    Some(Appraisers {
        levels,
        word: word?.to_owned(),
    })
}

fn trials(node: &Node<'_>) -> Option<u32> {
    let trials = node.whole(1..=1_000, "a number of trials")?;
    if trials == 1 {
        node.place.warn(
            "one trial",
            "two or more",
            "with one, repeatability cannot be told from the interaction",
        );
    }
    Some(trials)
}

fn confidence(node: &Node<'_>) -> Option<f64> {
    let expected = "a confidence from 0.5 to below 1";
    let confidence = node.number(|_| true, expected)?;
    if (50.0..100.0).contains(&confidence) {
        node.fault_hint(
            expected,
            format!("write {confidence} % as {}", confidence / 100.0),
        );
    } else if !(0.5..1.0).contains(&confidence) {
        node.fault(expected);
    }
    (0.5..1.0).contains(&confidence).then_some(confidence)
}

const ALL_RANDOM: &str = "every factor is taken as random; confidence limits beside a fixed one need methods that are not here";

fn factors<'a>(table: &Table<'a>) -> Option<Vec<(PlanFactor, Place<'a>)>> {
    let Some(node) = table.get("factor") else {
        return Some(Vec::new());
    };
    let mut names = Vec::new();
    let mut factors = Vec::new();
    let tables = node.tables("plan.factor", &table.place)?;
    let written = tables.len();
    for table in tables {
        let name = table
            .need("name", "the factor's name")
            .and_then(|node| unique(&node, &mut names));
        let levels = table
            .need("levels", "a number of levels, or a list of their names")
            .and_then(|node| levels(&node, 2, "a number of levels"));
        if let Some(within) = table.get("within") {
            if !within.is_list() {
                within.fault("an empty list");
            } else if !within.is_empty_list() {
                within
                    .place
                    .fault("nested factors: not yet", "an empty list");
            }
        }
        table.never(&["fixed", "random"], ALL_RANDOM);
        table.finish();
        if let (Some(name), Some(levels)) = (name, levels) {
            factors.push((
                PlanFactor {
                    name: name.to_owned(),
                    levels,
                },
                table.place.clone(),
            ));
        }
    }
    (factors.len() == written).then_some(factors)
}

/// The list and the tables, merged and checked against the plan's limits.
fn characteristics(
    table: &Table<'_>,
    judging: Option<(Limits, Judge)>,
    process: Option<restudy_engine::Process>,
    folders: &Folders<'_>,
) -> Option<Vec<Characteristic>> {
    let tables = match table.get("characteristic") {
        None => Some(Vec::new()),
        Some(node) => node.tables("plan.characteristic", &table.place),
    };
    let tables = tables.map(|tables| {
        tables
            .iter()
            .filter_map(characteristic::draft)
            .collect::<Vec<_>>()
    });
    let file = match table.get("characteristics") {
        None => None,
        Some(node) => Some(list_file(&node, folders)?),
    };
    let findings = table.place.source.findings;
    let source = file.as_ref().map(|(file, text)| Source {
        file,
        text,
        findings,
    });
    let list = match &source {
        None => None,
        Some(source) => Some(list::drafts(source)?),
    };
    let drafts = characteristic::merged(list, tables?);
    let (limits, _) = judging?;
    let written = drafts.len();
    let checked: Vec<Characteristic> = drafts
        .iter()
        .filter_map(|draft| characteristic::checked(draft, limits, process))
        .collect();
    (checked.len() == written).then_some(checked)
}

/// Name and text of the list's file.
fn list_file(node: &Node<'_>, folders: &Folders<'_>) -> Option<(String, String)> {
    let path = folders.path(node)?;
    match folders.disk.text(&path) {
        Ok(text) => Some((shortened(node.as_text()?), text)),
        Err(error) => {
            node.place.fault(
                format!("{}: {error}", node.found()),
                "a readable list of characteristics",
            );
            None
        }
    }
}

fn bounded(place: &Place<'_>, plan: &Plan) -> Option<()> {
    let appraisers = plan
        .appraisers
        .as_ref()
        .map_or(1, |appraisers| count(&appraisers.levels));
    let counts = [
        count(&plan.parts),
        appraisers,
        usize::try_from(plan.trials).ok()?,
    ];
    let counts = counts
        .into_iter()
        .chain(plan.factors.iter().map(|factor| count(&factor.levels)));
    let runs = counts.fold(1_usize, usize::saturating_mul);
    if runs > RUNS_MAX {
        place.fault_hint(
            format!("a design of {runs} runs"),
            format!("up to {RUNS_MAX} runs in a round"),
            "split the plan, or use fewer levels",
        );
        return None;
    }
    Some(())
}

/// Factors and the appraiser's word have different names.
fn apart(table: &Table<'_>, plan: &Plan, factor_places: &[Place<'_>]) {
    let word = plan
        .appraisers
        .as_ref()
        .map(|appraisers| appraisers.word.as_str());
    let taken = ["part", "appraiser", "trial"].into_iter().chain(word);
    for (factor, place) in plan.factors.iter().zip(factor_places) {
        if taken.clone().any(|other| fold(other) == fold(&factor.name)) {
            place.fault("a name that another factor has", "a name of its own");
        }
    }
    if let Some(word) = word
        && ["part", "trial"]
            .into_iter()
            .any(|other| fold(other) == fold(word))
    {
        table
            .place_of("appraiser_word")
            .fault(format!("`{word}`"), "a word that is not another factor's");
    }
    if let (Some(within), Some(every)) = (plan.finish_within, plan.repeat_every)
        && within > every
    {
        table.place_of("finish_within").warn(
            "more time than `repeat_every`",
            "less than `repeat_every`",
            "the next study would be due before this one is closed",
        );
    }
}
