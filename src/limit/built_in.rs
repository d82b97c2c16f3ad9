//! The limit files that come with the program.

use super::{Limit, read_limit};

/// A limit file that comes with the program.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct BuiltIn {
    /// Its file name.
    pub file_name: &'static str,
    /// Its text: the grammar is that of a user's own limit file.
    pub text: &'static str,
    /// Whether it is used where no limit is asked for.
    pub is_default: bool,
}

macro_rules! built_in {
    ($file:literal, $is_default:literal) => {
        BuiltIn {
            file_name: $file,
            text: include_str!(concat!("../../limits/", $file)),
            is_default: $is_default,
        }
    };
}

const BUILT_IN: [BuiltIn; 6] = [
    built_in!("47-cfr-15-109-class-b.yaml", true),
    built_in!("47-cfr-15-109-class-a.yaml", false),
    built_in!("cispr-32-class-b-3m.yaml", true),
    built_in!("cispr-32-class-b-10m.yaml", true),
    built_in!("cispr-32-class-a-3m.yaml", false),
    built_in!("cispr-32-class-a-10m.yaml", false),
];

impl BuiltIn {
    /// The limit in the file.
    pub fn limit(&self) -> Limit {
        read_limit(self.text, self.file_name).expect("a test reads every file that is built in")
    }
}

/// Every limit file that comes with the program.
pub fn built_in() -> &'static [BuiltIn] {
    &BUILT_IN
}

/// The limits used where none is asked for: 47 CFR 15.109 class B and CISPR 32 class B.
pub fn default_limits() -> Vec<Limit> {
    BUILT_IN
        .iter()
        .filter(|file| file.is_default)
        .map(BuiltIn::limit)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn limit(file_name: &str) -> Limit {
        BUILT_IN
            .iter()
            .find(|file| file.file_name == file_name)
            .unwrap()
            .limit()
    }

    #[track_caller]
    fn states(file_name: &str, distance_m: f64, rows: &[(f64, f64)]) {
        let limit = limit(file_name);
        assert_eq!(limit.distance_m, distance_m);
        for (frequency_mhz, level) in rows {
            let stated = limit.at(frequency_mhz * 1e6).unwrap();
            assert!(
                (stated - level).abs() < 0.005,
                "{frequency_mhz} MHz: {stated}"
            );
        }
        assert_eq!(limit.at(29.9e6), None);
    }

    /// 47 CFR 15.109(a), (b), turned into dBuV/m.
    #[test]
    fn states_47_cfr_15_109() {
        let class_b = [
            (50.0, 40.0),
            (100.0, 43.52),
            (500.0, 46.02),
            (970.0, 53.98),
            (2e3, 53.98),
        ];
        states("47-cfr-15-109-class-b.yaml", 3.0, &class_b);
        let class_a = [
            (50.0, 39.08),
            (100.0, 43.52),
            (500.0, 46.44),
            (970.0, 49.54),
            (2e3, 49.54),
        ];
        states("47-cfr-15-109-class-a.yaml", 10.0, &class_a);
    }

    /// 47 CFR 15.109(c): the lower limit applies at the edge of two bands.
    #[test]
    fn the_lower_value_holds_at_a_shared_edge() {
        let edges = [
            (30.0, 40.0),
            (88.0, 40.0),
            (216.0, 43.52),
            (960.0, 46.02),
            (40e3, 53.98),
        ];
        states("47-cfr-15-109-class-b.yaml", 3.0, &edges);
        assert_eq!(limit("47-cfr-15-109-class-b.yaml").at(40.1e9), None);
        // Stepping down: 57 to 1 GHz, 56 above
        assert_eq!(limit("cispr-32-class-a-3m.yaml").at(1e9), Some(56.0));
    }

    /// CISPR 32 (2015); class A and all above 1 GHz from memory.
    #[test]
    fn states_cispr_32() {
        let class_b = [(100.0, 40.0), (500.0, 47.0), (2e3, 50.0), (5e3, 54.0)];
        states("cispr-32-class-b-3m.yaml", 3.0, &class_b);
        states(
            "cispr-32-class-b-10m.yaml",
            10.0,
            &[(100.0, 30.0), (500.0, 37.0)],
        );
        let class_a = [(100.0, 50.0), (500.0, 57.0), (2e3, 56.0), (5e3, 60.0)];
        states("cispr-32-class-a-3m.yaml", 3.0, &class_a);
        states(
            "cispr-32-class-a-10m.yaml",
            10.0,
            &[(100.0, 40.0), (500.0, 47.0)],
        );
    }

    #[test]
    fn the_defaults_are_class_b() {
        let titles: Vec<String> = default_limits()
            .into_iter()
            .map(|limit| limit.title)
            .collect();
        assert_eq!(
            titles,
            [
                "47 CFR 15.109 class B",
                "CISPR 32 class B",
                "CISPR 32 class B"
            ]
        );
    }

    #[test]
    fn every_file_names_its_source() {
        assert!(BUILT_IN.iter().all(|file| file.limit().source.is_some()));
    }
}
