//! `run.json`: what was run, when and where.

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use std::collections::BTreeMap;
use std::fmt::Write as _;

use super::Scored;
use crate::methods::NoAnswer;

/// Layout version of `run.json`.
const FORMAT: u32 = 1;

/// Contents of `run.json`. The clock and the machine are the only entries of a result folder that
/// may differ between two runs of the same scenario.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RunRecord {
    /// Layout version.
    pub format: u32,
    /// Program name.
    pub program: String,
    /// Program version.
    pub version: String,
    /// SHA-256 of the scenario text, hexadecimal.
    pub scenario_sha256: String,
    /// Seed of every stream.
    pub seed: u64,
    /// Trials asked for, per truth.
    pub trials_asked: u64,
    /// Trials replayed, one entry per truth.
    pub trials_done: Vec<u64>,
    /// Trials without an answer over all truths and estimands; reasons that did not occur are
    /// absent.
    pub failures: Vec<FailureTotal>,
    /// Which part of a split run this is; `None` for a whole run.
    pub shard: Option<Shard>,
    /// When, and for how long.
    pub clock: Clock,
    /// Where.
    pub machine: Machine,
}

/// Trials in which a method gave no answer for one reason.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct FailureTotal {
    /// Method label.
    pub method: String,
    /// Key of the reason.
    pub reason: String,
    /// Trials, summed over truths and estimands.
    pub trials: u64,
}

/// One part of a split run.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Shard {
    /// Which part, counted from one.
    pub index: u64,
    /// Number of parts.
    pub of: u64,
}

/// When a run began and how long it took.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Clock {
    /// Start, UTC, as `2027-03-11T08:00:00Z`.
    pub started: String,
    /// Seconds until everything was scored.
    pub seconds: f64,
}

/// Where a run took place.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Machine {
    /// Operating system.
    pub system: String,
    /// Processor architecture.
    pub architecture: String,
    /// Threads used.
    pub threads: usize,
}

impl Machine {
    /// This machine.
    #[must_use]
    pub fn current(threads: usize) -> Self {
        Self {
            system: std::env::consts::OS.to_owned(),
            architecture: std::env::consts::ARCH.to_owned(),
            threads,
        }
    }
}

impl RunRecord {
    /// The record of a finished run.
    #[must_use]
    pub fn new(
        scored: &Scored,
        scenario_text: &str,
        seed: u64,
        trials_asked: u64,
        shard: Option<Shard>,
        clock: Clock,
        machine: Machine,
    ) -> Self {
        Self {
            format: FORMAT,
            program: env!("CARGO_PKG_NAME").to_owned(),
            version: env!("CARGO_PKG_VERSION").to_owned(),
            scenario_sha256: sha256_hex(scenario_text.as_bytes()),
            seed,
            trials_asked,
            trials_done: scored
                .measures
                .iter()
                .map(|measures| measures.trials)
                .collect(),
            failures: failure_totals(scored),
            shard,
            clock,
            machine,
        }
    }

    /// The text of `run.json`.
    ///
    /// # Errors
    /// If JSON cannot hold a value; none of these types can bring that about.
    pub fn to_json(&self) -> serde_json::Result<String> {
        Ok(serde_json::to_string_pretty(self)? + "\n")
    }
}

fn failure_totals(scored: &Scored) -> Vec<FailureTotal> {
    let mut totals: BTreeMap<(usize, NoAnswer), u64> = BTreeMap::new();
    for cell in scored.measures.iter().flat_map(|measures| &measures.cells) {
        for &(reason, count) in &cell.failures {
            *totals.entry((cell.method, reason)).or_default() += count;
        }
    }
    let total = |((method, reason), trials): ((usize, NoAnswer), u64)| FailureTotal {
        method: scored.methods[method].clone(),
        reason: reason.key().to_owned(),
        trials,
    };
    totals.into_iter().map(total).collect()
}

/// SHA-256 of some bytes, hexadecimal.
#[must_use]
pub fn sha256_hex(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .fold(String::with_capacity(64), |mut text, byte| {
            // Writing to a string cannot fail.
            let _ = write!(text, "{byte:02x}");
            text
        })
}

/// Seconds since 1970 as a UTC date and time, proleptic Gregorian calendar without leap seconds.
#[must_use]
pub fn utc_text(seconds_since_1970: u64) -> String {
    const DAY: u64 = 86_400;
    let (mut days, second) = (seconds_since_1970 / DAY, seconds_since_1970 % DAY);
    let mut year = 1970_u64;
    loop {
        let length = if leap(year) { 366 } else { 365 };
        if days < length {
            break;
        }
        days -= length;
        year += 1;
    }
    let february = if leap(year) { 29 } else { 28 };
    let mut month = 1;
    for length in [31, february, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31] {
        if days < length {
            break;
        }
        days -= length;
        month += 1;
    }
    let (hour, minute) = (second / 3600, second / 60 % 60);
    format!(
        "{year:04}-{month:02}-{:02}T{hour:02}:{minute:02}:{:02}Z",
        days + 1,
        second % 60
    )
}

fn leap(year: u64) -> bool {
    year.is_multiple_of(4) && (!year.is_multiple_of(100) || year.is_multiple_of(400))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::fixtures;

    #[test]
    fn dates_follow_the_calendar() {
        // `date -u -d @N +%FT%TZ` of GNU coreutils.
        assert_eq!(utc_text(0), "1970-01-01T00:00:00Z");
        assert_eq!(utc_text(951_782_400), "2000-02-29T00:00:00Z");
        assert_eq!(utc_text(1_804_752_000), "2027-03-11T08:00:00Z");
        assert_eq!(utc_text(4_107_542_399), "2100-02-28T23:59:59Z");
        assert_eq!(utc_text(4_107_542_400), "2100-03-01T00:00:00Z");
    }

    #[test]
    fn hash_agrees_with_the_standard() {
        // FIPS 180-2, appendix B.1 (recalled): the digest of "abc".
        assert_eq!(
            sha256_hex(b"abc"),
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
        );
    }

    #[test]
    fn record_reads_back_and_sums_failures() {
        let record = RunRecord::new(
            &fixtures::scored(3),
            "format = 1\n",
            7,
            10_000,
            None,
            Clock {
                started: utc_text(0),
                seconds: 1.5,
            },
            Machine::current(2),
        );
        let text = record.to_json().unwrap();
        assert_eq!(serde_json::from_str::<RunRecord>(&text).unwrap(), record);
        // Seven and five failures in each of 2 truths × 2 estimands.
        assert_eq!(
            record
                .failures
                .iter()
                .map(|total| total.trials)
                .collect::<Vec<_>>(),
            [28, 20]
        );
        assert_eq!(record.failures[0].reason, "rank-deficient");
        assert_eq!(record.trials_done, [10_000, 10_000]);
    }
}
