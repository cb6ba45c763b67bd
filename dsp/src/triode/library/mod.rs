//! The tube library: one data file a type, written by `tools/fit-tubes` and embedded here.

mod record;

use std::sync::{Arc, OnceLock};

pub use record::{
    CapacitanceRecord, Errors, Evidence, FitRecord, GridRecord, HeaterRecord, LimitsRecord, NotStated, Parameters,
    Record, Row, SeriesHeater, Stated, Sure,
};

use super::TubeType;

/// A data file, read when it is first asked for.
struct Entry {
    name: &'static str,
    text: &'static str,
    read: OnceLock<Option<(Record, Arc<TubeType>)>>,
}

macro_rules! entries {
    ($($name:literal),* $(,)?) => {
        static ENTRIES: [Entry; [$($name),*].len()] = [$(Entry {
            name: $name,
            text: include_str!(concat!("types/", $name, ".toml")),
            read: OnceLock::new(),
        }),*];
    };
}
entries!(
    "12AX7", "12AT7", "12AU7", "12AY7", "12BH7A", "6SN7GTB", "6SL7GT", "6J5", "6CG7", "6C4", "6DJ8", "E88CC",
    "6N23P", "6N2P", "6N6P", "6N30P", "E182CC", "5687", "ECC99", "12B4A", "5842", "6S45P",
);

impl Entry {
    // The tests read every embedded file, so none is ever missing for a user.
    fn read(&self) -> Option<&(Record, Arc<TubeType>)> {
        let parse = || {
            let record: Record = toml::from_str(self.text).ok()?;
            let tube = Arc::new(record.tube_type());
            Some((record, tube))
        };
        self.read.get_or_init(parse).as_ref()
    }
}

/// The types' names, in the library's order.
pub fn names() -> impl ExactSizeIterator<Item = &'static str> {
    ENTRIES.iter().map(|entry| entry.name)
}

/// The type of that name (or of an alias, such as ECC83), upper or lower case; `None` where the library has none.
pub fn find(name: &str) -> Option<Arc<TubeType>> {
    entry(name).map(|(_, tube)| Arc::clone(tube))
}

/// All that is known of a type, with sources, residuals and doubts.
pub fn record(name: &str) -> Option<&'static Record> {
    entry(name).map(|(record, _)| record)
}

fn entry(name: &str) -> Option<&'static (Record, Arc<TubeType>)> {
    let same = |other: &str| other.eq_ignore_ascii_case(name);
    let named = ENTRIES.iter().find(|entry| same(entry.name));
    named.and_then(Entry::read).or_else(|| {
        ENTRIES.iter().filter_map(Entry::read).find(|(record, _)| record.aliases.iter().any(|alias| same(alias)))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_data_file_is_read_and_named_as_it_says() {
        for entry in &ENTRIES {
            let record: Record = toml::from_str(entry.text).unwrap_or_else(|e| panic!("{}: {e}", entry.name));
            assert_eq!(record.name, entry.name);
        }
    }

    #[test]
    fn an_alias_finds_the_type_and_a_stranger_finds_nothing() {
        assert_eq!(find("ecc83").map(|tube| tube.name.clone()).as_deref(), Some("12AX7"));
        assert!(find("12AX8").is_none());
    }
}
