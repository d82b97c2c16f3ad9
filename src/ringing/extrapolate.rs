//! The state that a slow march would come to.

/// Where a march settles, found from the states that its rounds start from and lead to.
///
/// Of all starts so far, in proportions that add up to one, the mixture whose change over a round is least is taken, and
/// where a round leads from there is the next start (Anderson, J. ACM 12, 1965; on a linear net it is the method of
/// generalised minimal residuals, see Walker & Ni, SIAM J. Numer. Anal. 49, 2011). It removes slow relaxations and
/// undamped resonances, one each round.
#[derive(Debug, Default)]
pub(super) struct Extrapolation {
    last: Option<Round>,
    /// What changed together from round to round, each change at right angles to the earlier ones and of unit length.
    together: Vec<Round>,
    /// How often it began anew.
    pub(super) restarts: usize,
}

/// A round of the march, or a difference of rounds.
#[derive(Debug)]
struct Round {
    /// Where it leads.
    reached: Vec<f64>,
    /// How far that is from where it starts.
    change: Vec<f64>,
}

impl Extrapolation {
    /// Rounds remembered before it begins anew: what is known of a net that clamps goes stale.
    const MOST: usize = 12;
    /// It also begins anew where a round changed by so much more than the last.
    const ASTRAY: f64 = 4.0;

    /// Where the next round should start, and how far that is from where this one did: an estimate of how far this one
    /// was off.
    pub(super) fn next(&mut self, start: &[f64], reached: Vec<f64>) -> (Vec<f64>, f64) {
        let change = difference(&reached, start);
        let round = Round { reached, change };
        if let Some(last) = &self.last {
            let (length, last_length) = (norm(&round.change), norm(&last.change));
            if self.together.len() == Self::MOST || length > Self::ASTRAY * last_length {
                self.together.clear();
                self.restarts += 1;
            } else {
                let step = Round {
                    reached: difference(&round.reached, &last.reached),
                    change: difference(&round.change, &last.change),
                };
                self.add(step);
            }
        }
        let mut next = round.reached.clone();
        let mut left = round.change.clone();
        for step in &self.together {
            let share = dot(&step.change, &left);
            take_off(&mut left, share, &step.change);
            take_off(&mut next, share, &step.reached);
        }
        self.last = Some(round);
        let farthest = next
            .iter()
            .zip(start)
            .map(|(next, start)| (next - start).abs())
            // The maximum alone would pass over what is no number.
            .map(|off| if off.is_nan() { f64::INFINITY } else { off })
            .fold(0.0, f64::max);
        (next, farthest)
    }

    /// Gram-Schmidt.
    fn add(&mut self, mut step: Round) {
        /// Of a change that lies within the earlier ones, rounding errors are left.
        const NOTHING: f64 = 1e-10;
        let length = norm(&step.change);
        for earlier in &self.together {
            let share = dot(&earlier.change, &step.change);
            take_off(&mut step.change, share, &earlier.change);
            take_off(&mut step.reached, share, &earlier.reached);
        }
        let left = norm(&step.change);
        if left > NOTHING * length {
            for value in step.change.iter_mut().chain(&mut step.reached) {
                *value /= left;
            }
            self.together.push(step);
        }
    }
}

fn difference(a: &[f64], b: &[f64]) -> Vec<f64> {
    a.iter().zip(b).map(|(a, b)| a - b).collect()
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

fn norm(a: &[f64]) -> f64 {
    dot(a, a).sqrt()
}

fn take_off(from: &mut [f64], share: f64, direction: &[f64]) {
    for (from, direction) in from.iter_mut().zip(direction) {
        *from -= share * direction;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A map with two slow relaxations and a slow oscillation comes to rest after as many rounds and two.
    #[test]
    fn slow_relaxations_are_removed() {
        let rest = [1.0, -2.0, 0.5, 0.25];
        let round = |x: &[f64]| {
            let d: Vec<f64> = x.iter().zip(rest).map(|(x, r)| x - r).collect();
            let (sin, cos) = 0.3_f64.sin_cos();
            vec![
                rest[0] + 0.99 * d[0],
                rest[1] + 0.9 * d[1],
                rest[2] + 0.999 * (cos * d[2] - sin * d[3]),
                rest[3] + 0.999 * (sin * d[2] + cos * d[3]),
            ]
        };
        let mut extrapolation = Extrapolation::default();
        let mut start = vec![0.0; 4];
        let mut farthest = f64::INFINITY;
        for _ in 0..6 {
            let off = (start.iter().zip(rest)).fold(0.0, |off: f64, (x, r)| off.max((x - r).abs()));
            (start, farthest) = extrapolation.next(&start.clone(), round(&start));
            // The estimate is of the right size, once the slowest are known.
            assert!(off < 1e-5 || farthest > 0.01 * off, "{off} {farthest}");
        }
        assert!(farthest < 1e-6, "{farthest}");
        for (found, rest) in start.iter().zip(rest) {
            assert!((found - rest).abs() < 1e-6, "{found} {rest}");
        }
    }

    #[test]
    fn what_does_not_change_has_settled() {
        let mut extrapolation = Extrapolation::default();
        for _ in 0..3 {
            let (next, farthest) = extrapolation.next(&[1.0, 2.0], vec![1.0, 2.0]);
            assert_eq!((next, farthest), (vec![1.0, 2.0], 0.0));
        }
    }

    #[test]
    fn what_is_no_number_has_not_settled() {
        let (_, farthest) = Extrapolation::default().next(&[1.0, 2.0], vec![f64::NAN, 2.0]);
        assert_eq!(farthest, f64::INFINITY);
    }
}
