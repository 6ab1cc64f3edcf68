//! Crafted workbooks: an error or rows set aside, in bounded memory and time, never a panic.
//!
//! Each is written to a file and read by this very program started anew (`probe`), so that its own memory
//! can be told.

#[cfg(test)]
mod books;

#[cfg(test)]
mod tests {
    use std::env;
    use std::path::{Path, PathBuf};
    use std::process::Command;

    use fs_err as fs;
    use restudy_parsers::{Export, Plain, read_plain};

    use crate::books;

    const FILE: &str = "RESTUDY_HOSTILE_FILE";
    const MEMORY_MAX: u64 = 256 << 20;
    /// Processor time; code that is not optimised may take four times as long.
    const TICKS_MAX: u64 = if cfg!(debug_assertions) { 2000 } else { 500 };

    /// The reading process: tells the outcome and the most memory it held.
    #[test]
    fn probe() {
        let Some(path) = env::var_os(FILE) else {
            return;
        };
        let bytes = fs::read(path).unwrap();
        let asked = Plain::default();
        let outcome = read_plain(
            Export {
                path: "run",
                bytes: &bytes,
            },
            &asked,
        );
        let told = match outcome {
            Ok(parsed) => format!(
                "{} read, {} set aside",
                parsed.readings.len(),
                parsed.set_aside.len()
            ),
            Err(refused) => format!("refused: {}", refused.sentence),
        };
        let status = fs::read_to_string("/proc/self/status").unwrap_or_default();
        let most = status
            .lines()
            .find_map(|line| line.strip_prefix("VmHWM:"))
            .unwrap_or("0 kB")
            .trim();
        // The times in user and system mode are the 14th and 15th fields, in hundredths of a second.
        let stat = fs::read_to_string("/proc/self/stat").unwrap_or_default();
        let ticks: u64 = stat
            .rsplit(") ")
            .next()
            .unwrap_or("")
            .split(' ')
            .skip(11)
            .take(2)
            .filter_map(|field| field.parse::<u64>().ok())
            .sum();
        let note = PathBuf::from(env::var_os(FILE).unwrap()).with_extension("told");
        fs::write(note, format!("{most}\n{ticks}\n{told}")).unwrap();
    }

    /// What is told of a file, its memory and time judged.
    fn read(name: &str, bytes: &[u8]) -> String {
        let file = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
        fs::write(&file, bytes).unwrap();
        let status = Command::new(env::current_exe().unwrap())
            .args(["--exact", "tests::probe"])
            .env(FILE, &file)
            .status()
            .unwrap();
        assert!(status.success(), "{name}: {status}");
        let note = fs::read_to_string(file.with_extension("told")).unwrap();
        let (most, rest) = note.split_once('\n').unwrap();
        let (ticks, told) = rest.split_once('\n').unwrap();
        let ticks: u64 = ticks.parse().unwrap();
        let most: u64 = most.trim_end_matches(" kB").parse().unwrap();
        fs::remove_file(&file).unwrap();
        assert!(most * 1024 <= MEMORY_MAX, "{name}: {most} kB, {told}");
        assert!(ticks <= TICKS_MAX, "{name}: {ticks} hundredths, {told}");
        told.to_owned()
    }

    /// One after another: the limits are those of one workbook.
    #[test]
    fn crafted_workbooks_cost_little_and_are_told() {
        for (name, made, expected) in books::ALL {
            let told = read(name, &made());
            assert!(told.contains(expected), "{name}: {told}");
        }
    }
}
