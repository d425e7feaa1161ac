//! The kinds of physical self-check, how far off each may be, and what one has found.
//!
//! Two things let a true answer miss an identity: the mesh, by an amount that the thresholds of this file cover, and
//! the accuracy that was asked for, which [`Check::allow`] adds. No accuracy however coarse lifts a threshold above
//! its cap: a wrong sign, permittivity or a hole in the mesh costs tens of percent and must not pass for a quick look.

use std::fmt;

/// An identity that every true solution satisfies.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CheckKind {
    /// The Maxwell matrix is symmetric.
    Reciprocity,
    /// Its diagonal is positive, all else is not.
    Signs,
    /// The sum of each row is not negative.
    Dominance,
    /// Free charge is the permittivity of the exterior times total charge.
    ChargeAtInfinity,
    /// The bound charge of a closed dielectric body sums to zero.
    Neutrality,
}

/// Reciprocity: the two entries differ only by the error of the mesh; a matrix that is 1 % off its own transpose is no
/// better than 1 %, the widest target that is of use.
const RECIPROCITY: f64 = 1e-2;

/// Signs, dominance: a tenth of the above, since entries that vanish in truth (shielded nets) come out as small numbers
/// of either sign.
const SIGN: f64 = 1e-3;

/// Charge at infinity, neutrality: measured 0.2 % at er = 4 and 0.6 % at er = 80 on 1.7k panels of a cube in a shell; 2 %
/// catches a hole in the mesh, which costs tens of percent.
const CHARGE: f64 = 2e-2;

/// Most that any target lifts a threshold to that compares entries of the matrix: 1 in 20. What is off by more is no
/// longer the matrix of a set of conductors, whatever the bars say of its entries one by one.
const ENTRY_CAP: f64 = 0.05;

/// Most that any target lifts a threshold to that compares sums of charge. The defect is that of two sums, so twice the
/// above: still below what a mistake costs. The permittivity of a coat read 1.3 times too large: 0.11 and 0.17
/// (`identities::a_coated_pair_passes_every_check`).
const CHARGE_CAP: f64 = 2.0 * ENTRY_CAP;

impl CheckKind {
    /// Stable name for `result.json`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            CheckKind::Reciprocity => "reciprocity",
            CheckKind::Signs => "signs",
            CheckKind::Dominance => "dominance",
            CheckKind::ChargeAtInfinity => "charge_at_infinity",
            CheckKind::Neutrality => "neutrality",
        }
    }

    /// What it compares, for people.
    #[must_use]
    pub fn meaning(self) -> &'static str {
        match self {
            CheckKind::Reciprocity => "largest |C_ij - C_ji| over sqrt(C_ii C_jj)",
            CheckKind::Signs => "largest wrong sign of an entry over sqrt(C_ii C_jj)",
            CheckKind::Dominance => "largest deficit of a row sum over C_ii",
            CheckKind::ChargeAtInfinity => "free charge against total charge, as seen from far away",
            CheckKind::Neutrality => "net bound charge of each closed dielectric body over that of its parts",
        }
    }

    /// Largest defect, a ratio, that the mesh of a good answer shows.
    #[must_use]
    pub fn threshold(self) -> f64 {
        match self {
            CheckKind::Reciprocity => RECIPROCITY,
            CheckKind::Signs | CheckKind::Dominance => SIGN,
            CheckKind::ChargeAtInfinity | CheckKind::Neutrality => CHARGE,
        }
    }

    /// Largest defect, a ratio, of an answer whose entries are within `target * max(|C_ij|, floor * sqrt(C_ii C_jj))` of
    /// the truth; never less than [`Self::threshold`], and never more than a cap.
    ///
    /// - Reciprocity: `target`. A bar is at least as wide as its entry's asymmetry, and `|C_ij| <= sqrt(C_ii C_jj)`.
    /// - Signs: `target * floor`. An entry that is within its bar of the truth and on the wrong side of zero is smaller
    ///   than its bar, and so, with a target under 1, one of those that are judged by the floor.
    /// - Dominance: `target`. Row sums are charges of the net itself, at one volt on all rows: judged as its diagonal.
    /// - Charge at infinity, neutrality: `2 target`. Free and total charge, or the parts that cancel, are each off by
    ///   the target.
    #[must_use]
    pub fn allowance(self, target: f64, floor: f64) -> f64 {
        let (share, cap) = match self {
            CheckKind::Reciprocity | CheckKind::Dominance => (target, ENTRY_CAP),
            CheckKind::Signs => (target * floor, ENTRY_CAP),
            CheckKind::ChargeAtInfinity | CheckKind::Neutrality => (2.0 * target, CHARGE_CAP),
        };
        share.min(cap).max(self.threshold())
    }
}

impl fmt::Display for CheckKind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

/// A physical self-check.
#[derive(Debug, Clone, PartialEq)]
pub struct Check {
    /// What it compares.
    pub kind: CheckKind,
    /// Its value and what follows from it.
    pub outcome: CheckOutcome,
}

/// The outcome of a check.
#[derive(Debug, Clone, PartialEq)]
pub enum CheckOutcome {
    /// It was made.
    Made {
        /// The measured defect, a ratio.
        value: f64,
        /// Largest defect that passes.
        threshold: f64,
    },
    /// It says nothing about this model.
    NotApplicable(
        /// Why.
        String,
    ),
}

impl Check {
    /// Whether the check passed; `None` when it does not apply.
    #[must_use]
    pub fn passed(&self) -> Option<bool> {
        match self.outcome {
            CheckOutcome::Made { value, threshold } => Some(value <= threshold),
            CheckOutcome::NotApplicable(_) => None,
        }
    }

    /// Adds to the threshold what [`CheckKind::allowance`] grants beyond [`CheckKind::threshold`].
    pub fn allow(&mut self, target: f64, floor: f64) {
        if let CheckOutcome::Made { threshold, .. } = &mut self.outcome {
            *threshold += self.kind.allowance(target, floor) - self.kind.threshold();
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const ALL: [CheckKind; 5] = [
        CheckKind::Reciprocity,
        CheckKind::Signs,
        CheckKind::Dominance,
        CheckKind::ChargeAtInfinity,
        CheckKind::Neutrality,
    ];

    /// What: a fine target leaves the thresholds, a coarse one raises them, none lifts them above the caps.
    /// Derived: the caps are 1 in 20 for entries and twice that for sums of charge. Tolerance: none, the same expressions.
    /// Seen to fail with: the cap left out.
    #[test]
    fn no_target_lifts_a_threshold_above_its_cap() {
        for kind in ALL {
            assert!(kind.allowance(1e-3, 0.01) <= kind.threshold(), "{kind}");
            let caps = [0.05, 0.1].map(|target| kind.allowance(target, 0.01));
            assert!(caps[0] <= caps[1], "{kind}");
            for (target, floor) in [(0.05, 0.01), (0.2, 1.0), (10.0, 1.0), (f64::INFINITY, 1.0)] {
                let charge = matches!(kind, CheckKind::ChargeAtInfinity | CheckKind::Neutrality);
                assert!(
                    kind.allowance(target, floor) <= if charge { 0.1 } else { 0.05 },
                    "{kind} at {target}"
                );
            }
        }
        assert!(0.04 < CheckKind::Reciprocity.allowance(0.05, 0.01));
    }

    /// What: the room that a threshold has for the tail of truncated interfaces stays when the target adds to it.
    /// Derived: 0.3 + (0.1 - 0.02). Tolerance: two roundings. Seen to fail with: `=` for `+=` in `allow`.
    #[test]
    fn an_allowance_is_added() {
        let outcome = CheckOutcome::Made { value: 0.37, threshold: 0.3 };
        let mut check = Check { kind: CheckKind::ChargeAtInfinity, outcome };
        assert_eq!(check.passed(), Some(false));
        check.allow(0.05, 0.01);
        let CheckOutcome::Made { threshold, .. } = check.outcome else { panic!("it was made") };
        assert!((threshold - 0.38).abs() < 4.0 * f64::EPSILON, "{threshold}");
        assert_eq!(check.passed(), Some(true));
    }
}
