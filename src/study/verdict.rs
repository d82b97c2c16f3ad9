//! What a margin means: the chance of failing, and a word for it.

/// Spread of what is not modelled (enclosure, package, slots, cable layout): a judgement, not a
/// measurement.
pub const MODEL_SIGMA_DB: f64 = 5.0;
/// Spread of the laboratory's instruments: half of the 6.3 dB expanded uncertainty that CISPR 16-4-2 (2011)
/// gives for radiated disturbance from 30 MHz to 1 GHz (from memory).
pub const INSTRUMENT_SIGMA_DB: f64 = 3.15;

const LIKELY_FAIL_FROM: f64 = 0.5;
/// From this chance of failing on, a net no longer likely passes.
pub(super) const MARGINAL_FROM: f64 = 0.05;

/// A word for the chance of failing.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// 50 % or more.
    LikelyFail,
    /// 5 % or more.
    Marginal,
    /// Less than 5 %.
    LikelyPass,
    /// No limit covers a harmonic, or nothing that radiates could be estimated.
    NotJudged,
}

impl Verdict {
    /// The word for a chance of failing.
    pub fn of(chance_of_failing: f64) -> Self {
        if chance_of_failing >= LIKELY_FAIL_FROM {
            Self::LikelyFail
        } else if chance_of_failing >= MARGINAL_FROM {
            Self::Marginal
        } else {
            Self::LikelyPass
        }
    }

    /// As shown to the user.
    pub fn as_str(self) -> &'static str {
        match self {
            Self::LikelyFail => "likely fail",
            Self::Marginal => "marginal",
            Self::LikelyPass => "likely pass",
            Self::NotJudged => "not judged",
        }
    }
}

impl std::fmt::Display for Verdict {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.pad(self.as_str())
    }
}

/// Root sum square of the model's and the instrument's spread.
pub fn total_sigma_db(model_sigma_db: f64) -> f64 {
    model_sigma_db.hypot(INSTRUMENT_SIGMA_DB)
}

/// Chance that the true reading lies over the limit: Phi(-margin / sigma).
pub fn chance_of_failing(margin_db: f64, sigma_db: f64) -> f64 {
    0.5 * libm::erfc(margin_db / sigma_db / std::f64::consts::SQRT_2)
}

/// The margin that leaves just less than a chance of failing between nothing and a half.
pub(super) fn margin_for_chance_db(chance: f64, sigma_db: f64) -> f64 {
    let (mut fails, mut passes) = (0.0, 40.0 * sigma_db);
    for _ in 0..60 {
        let middle = (fails + passes) / 2.0;
        if chance_of_failing(middle, sigma_db) < chance {
            passes = middle;
        } else {
            fails = middle;
        }
    }
    passes
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Quantiles of the normal distribution: Phi(-1.6449) = 5 % (any statistics table).
    #[test]
    fn chance_is_the_normal_tail() {
        assert!((chance_of_failing(0.0, 6.0) - 0.5).abs() < 1e-15);
        assert!((chance_of_failing(1.644_854 * 6.0, 6.0) - 0.05).abs() < 1e-7);
        assert!((chance_of_failing(-1.644_854 * 6.0, 6.0) - 0.95).abs() < 1e-7);
    }

    /// Quantile as above; the margin found is on the passing side.
    #[test]
    fn the_margin_for_a_chance_is_its_quantile() {
        let margin_db = margin_for_chance_db(0.05, 6.0);
        assert!((margin_db - 1.644_854 * 6.0).abs() < 1e-5);
        assert_eq!(
            Verdict::of(chance_of_failing(margin_db, 6.0)),
            Verdict::LikelyPass
        );
    }

    #[test]
    fn the_words_change_where_they_should() {
        assert_eq!(Verdict::of(0.5), Verdict::LikelyFail);
        assert_eq!(Verdict::of(0.4999), Verdict::Marginal);
        assert_eq!(Verdict::of(0.05), Verdict::Marginal);
        assert_eq!(Verdict::of(0.0499), Verdict::LikelyPass);
    }
}
