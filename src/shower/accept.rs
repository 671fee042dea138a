//! The accept rule: the only place where a shower changes weights.
//!
//! A trial drawn from an envelope g with true density f is accepted with probability p; the weight is multiplied by
//! f/(g p) on acceptance and by (1 - f/g)/(1 - p) on rejection. For 0 <= f <= g, p = f/g and the weight stays. Else
//! p = f/(2f - g), which minimises the mean squared weight. (Hoeche, Schumann & Siegert 2010, arXiv:0912.3501;
//! Lonnblad 2013, arXiv:1211.7204; Platzer & Sjodahl 2012, arXiv:1108.6180.)
//!
//! The factors of all trials belong to the event, also those of a branching that is discarded later.

/// How a trial ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Verdict {
    /// The trial becomes a branching.
    pub accepted: bool,
    /// The density lay outside [0, g]: the weight carries the difference.
    pub overshoot: bool,
}

/// Judges a trial of density over envelope `ratio` = f/g with a uniform number in [0, 1).
#[inline]
pub fn judge(ratio: f64, uniform: f64, weight: &mut f64) -> Verdict {
    if (0.0..=1.0).contains(&ratio) {
        return Verdict {
            accepted: uniform < ratio,
            overshoot: false,
        };
    }
    let probability = ratio / (2.0 * ratio - 1.0);
    let accepted = uniform < probability;
    *weight *= if accepted {
        ratio / probability
    } else {
        (1.0 - ratio) / (1.0 - probability)
    };
    Verdict {
        accepted,
        overshoot: true,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// For any ratio the mean weight is 1 and the mean weight of accepted trials is the ratio: p w + (1-p) w' = 1 and
    /// p w = f/g, exactly.
    #[test]
    fn weights_are_exact_in_the_mean() {
        for ratio in [-5.0, -1.0, -1e-3, 0.0, 0.3, 1.0, 1.0 + 1e-9, 1.5, 40.0_f64] {
            let probability = if (0.0..=1.0).contains(&ratio) {
                ratio
            } else {
                ratio / (2.0 * ratio - 1.0)
            };
            assert!((0.0..=1.0).contains(&probability));
            let (mut accepted, mut rejected) = (1.0, 1.0);
            judge(ratio, probability - 1e-12, &mut accepted);
            judge(ratio, probability, &mut rejected);
            assert!((probability * accepted - ratio).abs() < 1e-9 * (1.0 + ratio.abs()));
            assert!((probability * accepted + (1.0 - probability) * rejected - 1.0).abs() < 1e-9);
        }
    }

    #[test]
    fn a_density_inside_its_envelope_leaves_the_weight() {
        let mut weight = 1.0;
        for (ratio, uniform, accepted) in [
            (0.4, 0.39, true),
            (0.4, 0.41, false),
            (1.0, 0.999, true),
            (0.0, 0.0, false),
        ] {
            assert_eq!(
                judge(ratio, uniform, &mut weight),
                Verdict {
                    accepted,
                    overshoot: false
                }
            );
        }
        assert_eq!(weight, 1.0);
    }
}
