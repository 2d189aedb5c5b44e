//! Rotation sites: a rotation dephased about its own axis, as an equal-extent
//! ensemble of rotations, each split into diag(1, i^b).
//!
//! diag(1, e^{iθ}) on |+⟩ has the Bloch vector (cosθ, sinθ, 0), and dephasing by
//! q shortens it to (1−2q)(cosθ, sinθ, 0): an edge state, whose ensemble is the
//! two rotations at the ends of the chord along (1,−1,0). As the gate is
//! diagonal, the state determines it. PRX Quantum 2, 010345 (2021).

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, FRAC_PI_8, SQRT_2};

use num_complex::Complex64;

use super::extent::{self, ROUNDING};
use super::site::{RotationMember, RotationSite};

impl RotationSite {
    /// A rotation by `angle` in (0, π/2), dephased about its axis with
    /// probability `dephasing` in [0, 1/2].
    ///
    /// Every member has the extent [`RotationSite::extent`]; the members average
    /// to the dephased rotation to rounding.
    pub fn new(angle: f64, dephasing: f64) -> RotationSite {
        debug_assert!(
            (0.0..=FRAC_PI_2).contains(&angle),
            "an angle folded to [0, π/2] is expected, found {angle}"
        );
        debug_assert!(
            (0.0..=0.5 + ROUNDING).contains(&dephasing),
            "a dephasing probability in [0, 1/2] is expected, found {dephasing}"
        );
        let members = if is_mixture(angle, dephasing) {
            mixture(angle, dephasing)
        } else if dephasing == 0.0 {
            vec![RotationMember::splitting(1.0, angle)]
        } else {
            let chord = Chord::of(angle, dephasing);
            [(chord.share, 1.0), (1.0 - chord.share, -1.0)]
                .into_iter()
                .filter(|&(probability, _)| probability > 0.0)
                .map(|(probability, side)| {
                    let angle = (FRAC_PI_4 + side * chord.half_width).clamp(0.0, FRAC_PI_2);
                    RotationMember::splitting(probability, angle)
                })
                .collect()
        };
        RotationSite {
            angle,
            dephasing,
            members,
        }
    }

    /// Extent Ξ with the dephasing, the (Σ|weight|)² of every member: 1 to
    /// 1/cos²(π/8).
    pub fn extent(&self) -> f64 {
        if is_mixture(self.angle, self.dephasing) {
            1.0
        } else {
            let half_width = Chord::of(self.angle, self.dephasing).half_width;
            ((0.5 * half_width).cos() / FRAC_PI_8.cos()).powi(2)
        }
    }

    /// Extent of the rotation without the dephasing.
    pub fn extent_without_noise(&self) -> f64 {
        extent::of_rotation(self.angle)
    }
}

impl RotationMember {
    /// diag(1, e^{iθ}) = c0·1 + c1·diag(1, i), c1 = (1 − e^{iθ})/(1 − i), written
    /// without cancellation: |c0| = √2 sin(π/4 − θ/2), |c1| = √2 sin(θ/2).
    /// Quantum 3, 181 (2019).
    fn splitting(probability: f64, angle: f64) -> RotationMember {
        let half = 0.5 * angle;
        let zero = Complex64::new(0.0, 0.0);
        RotationMember {
            probability,
            angle,
            weights: [
                Complex64::from_polar(SQRT_2 * (FRAC_PI_4 - half).sin(), half),
                Complex64::from_polar(SQRT_2 * half.sin(), half - FRAC_PI_4),
                zero,
                zero,
            ],
        }
    }

    /// The Clifford gate diag(1, i^power).
    fn clifford(probability: f64, power: u8) -> RotationMember {
        let mut weights = [Complex64::new(0.0, 0.0); 4];
        weights[usize::from(power)] = Complex64::new(1.0, 0.0);
        RotationMember {
            probability,
            angle: f64::from(power) * FRAC_PI_2,
            weights,
        }
    }
}

/// The chord along (1,−1,0) through (1−2q)(cosθ, sinθ, 0).
struct Chord {
    /// The ends are at π/4 ± this.
    half_width: f64,
    /// Chance of the end at π/4 + `half_width`.
    share: f64,
}

impl Chord {
    fn of(angle: f64, dephasing: f64) -> Chord {
        let (sin, cos) = (angle - FRAC_PI_4).sin_cos();
        let length = 1.0 - 2.0 * dephasing;
        // sin² = 1 − (1−2q)² cos²(θ−π/4) without the cancellation at small q.
        let half_sin = (sin * sin + cos * cos * 4.0 * dephasing * (1.0 - dephasing)).sqrt();
        let share = if half_sin > 0.0 {
            (0.5 * (1.0 + length * sin / half_sin)).clamp(0.0, 1.0)
        } else {
            1.0
        };
        Chord {
            half_width: half_sin.atan2(length * cos),
            share,
        }
    }
}

/// Whether the dephased rotation is a mixture of Clifford gates.
fn is_mixture(angle: f64, dephasing: f64) -> bool {
    let (sin, cos) = angle.sin_cos();
    (1.0 - 2.0 * dephasing) * (sin + cos) <= 1.0 + ROUNDING
}

/// The dephased rotation as a mixture of 1, diag(1, i) and diag(1, −1).
fn mixture(angle: f64, dephasing: f64) -> Vec<RotationMember> {
    let (sin, cos) = angle.sin_cos();
    let length = (1.0 - 2.0 * dephasing).max(0.0);
    // At π/2 the cosine is rounding, of either sign.
    let (x, y) = (length * cos.max(0.0), length * sin.max(0.0));
    // Above 1 only by rounding.
    let scale = if x + y > 1.0 { 1.0 / (x + y) } else { 1.0 };
    let left_over = 0.5 * (1.0 - x - y).max(0.0);
    [x * scale + left_over, y * scale, left_over]
        .into_iter()
        .zip(0u8..)
        .filter(|&(probability, _)| probability > 0.0)
        .map(|(probability, power)| RotationMember::clifford(probability, power))
        .collect()
}

#[cfg(test)]
mod tests {
    use std::f64::consts::FRAC_1_SQRT_2;

    use super::*;

    /// Weighted sum of diag(1, i^b).
    fn diagonal(member: &RotationMember) -> [Complex64; 2] {
        let mut entries = [Complex64::new(0.0, 0.0); 2];
        for (power, weight) in (0..).zip(member.weights) {
            entries[0] += weight;
            entries[1] += weight * Complex64::i().powi(power);
        }
        entries
    }

    fn sum_of_moduli(member: &RotationMember) -> f64 {
        member.weights.iter().map(|weight| weight.norm()).sum()
    }

    /// All that is promised of a site, against the coherence (1−2q)e^{iθ} a
    /// dephased rotation leaves of |+⟩.
    fn check(angle: f64, dephasing: f64) {
        let site = RotationSite::new(angle, dephasing);
        let what = format!("angle {angle}, dephasing {dephasing}");
        let mut total = 0.0;
        let mut coherence = Complex64::new(0.0, 0.0);
        for member in &site.members {
            assert!(member.probability > 0.0, "{what}");
            total += member.probability;
            let entries = diagonal(member);
            let expected = Complex64::from_polar(1.0, member.angle);
            assert!((entries[0] - 1.0).norm() < 1e-14, "{what}: {member:?}");
            assert!((entries[1] - expected).norm() < 1e-14, "{what}: {member:?}");
            coherence += member.probability * entries[1];
            let extent = sum_of_moduli(member).powi(2);
            assert!((extent - site.extent()).abs() < 1e-12, "{what}: {extent}");
            if site.extent() > 1.0 {
                assert!((0.0..=FRAC_PI_2).contains(&member.angle), "{what}");
                assert_eq!(member.weights[2..], [Complex64::new(0.0, 0.0); 2]);
            } else {
                let used = member.weights.iter().filter(|w| w.norm() != 0.0).count();
                assert_eq!(used, 1, "{what}");
            }
        }
        assert!((total - 1.0).abs() < 1e-14, "{what}");
        let expected = Complex64::from_polar(1.0 - 2.0 * dephasing, angle);
        assert!((coherence - expected).norm() < 2e-14, "{what}: {coherence}");
        assert!(site.extent() >= 1.0 && site.extent() <= site.extent_without_noise() + 1e-14);
    }

    #[test]
    fn members_average_to_the_dephased_rotation() {
        for i in 1..200 {
            let angle = FRAC_PI_2 * f64::from(i) / 200.0;
            for j in 0..=100 {
                check(angle, 0.005 * f64::from(j));
            }
        }
    }

    #[test]
    fn members_are_right_at_the_edges_of_the_range() {
        let tiny = [0.0, 1e-300, 1e-17, 1e-15, 1e-12, 1e-8, 1e-4];
        for near in tiny {
            for q in tiny {
                check(near, q);
                check(FRAC_PI_2 - near, q);
                check(FRAC_PI_4 + near, q);
                check(FRAC_PI_4 - near, q);
                check(near, 0.5 - q);
            }
        }
        // Just either side of the dephasing that makes a mixture of Cliffords.
        for angle in [1e-6, 0.01, 0.3, FRAC_PI_4, 1.1, 1.57] {
            let threshold = 0.5 * (1.0 - 1.0 / (f64::sin(angle) + f64::cos(angle)));
            for offset in [-1e-6, -1e-10, -1e-13, -1e-15, 0.0, 1e-15, 1e-13, 1e-10] {
                check(angle, f64::max(threshold + offset, 0.0));
            }
        }
    }

    /// Quantum 3, 181 (2019), from memory; recomputed by a dual linear program.
    #[test]
    fn extents_of_rotations() {
        let table = [
            (0.01, 1.0041213561),
            (0.1, 1.0392830127),
            (0.2, 1.0740348374),
            (0.3, 1.1039082456),
            (0.5, 1.1478775971),
            (FRAC_PI_4, 1.1715728753),
            (1.1, 1.1428222784),
            (1.5, 1.0282626978),
        ];
        for (angle, extent) in table {
            let site = RotationSite::new(angle, 0.0);
            assert_eq!(site.members.len(), 1);
            assert_eq!(site.members[0].angle, angle);
            assert!((site.extent() / extent - 1.0).abs() < 1e-9, "{angle}");
            assert!((site.extent_without_noise() / extent - 1.0).abs() < 1e-9);
            check(angle, 0.0);
        }
    }

    /// Normalised moduli, |c_I| ∝ sin(π/4 − θ/2), |c_S| ∝ sin(θ/2); recomputed
    /// by linear programming.
    #[test]
    fn normalised_weights_of_rotations() {
        for (angle, identity, s) in [
            (0.3, 0.79885468, 0.20114532),
            (FRAC_PI_4, 0.5, 0.5),
            (1.1, 0.30853924, 0.69146076),
        ] {
            let member = RotationSite::new(angle, 0.0).members[0];
            let sum = sum_of_moduli(&member);
            assert!((member.weights[0].norm() / sum - identity).abs() < 1e-8);
            assert!((member.weights[1].norm() / sum - s).abs() < 1e-8);
        }
        // T = c0·1 + c1·S; Quantum 3, 181 (2019), arXiv:1808.00128.
        let t = RotationSite::new(FRAC_PI_4, 0.0).members[0];
        let modulus = 0.541196100146;
        let c0 = Complex64::from_polar(modulus, FRAC_PI_8);
        assert!((t.weights[0] - c0).norm() < 1e-12);
        assert!((t.weights[1] - c0.conj()).norm() < 1e-12);
    }

    /// (1−p)/cos²(π/8): PRX Quantum 2, 010345 (2021), from memory; recomputed by
    /// a primal and a dual bound that agree to 1e-12.
    #[test]
    fn extents_of_dephased_t() {
        for (p, extent) in [
            (0.0, 1.171572875254),
            (0.01, 1.159857146501),
            (0.05, 1.112994231491),
            (0.1, 1.054415587728),
            (0.14, 1.007552672718),
            (0.2, 1.0),
            (0.5, 1.0),
        ] {
            let site = RotationSite::new(FRAC_PI_4, p);
            assert!((site.extent() / extent - 1.0).abs() < 1e-12, "p = {p}");
            assert!((site.extent_without_noise() / 1.171572875254 - 1.0).abs() < 1e-12);
            check(FRAC_PI_4, p);
        }
        // Members at π/4 ± α, cosα = 1 − 2p, equally likely.
        let site = RotationSite::new(FRAC_PI_4, 0.05);
        for (member, side) in site.members.iter().zip([1.0, -1.0]) {
            assert!((member.probability - 0.5).abs() < 1e-15);
            assert!((member.angle - FRAC_PI_4 - side * f64::acos(0.9)).abs() < 1e-14);
        }
    }

    /// (1 − 1/√2)/2 = sin²(π/8): from there on a dephased T is a mixture of
    /// Clifford gates. PRX Quantum 2, 010345 (2021), from memory.
    #[test]
    fn threshold_of_dephased_t() {
        let threshold = 0.5 * (1.0 - FRAC_1_SQRT_2);
        assert!((threshold - 0.146446609407_f64).abs() < 1e-12);
        assert_eq!(RotationSite::new(FRAC_PI_4, threshold).extent(), 1.0);
        assert_eq!(RotationSite::new(FRAC_PI_4, threshold + 1e-9).extent(), 1.0);
        let below = RotationSite::new(FRAC_PI_4, threshold - 1e-9).extent();
        assert!(below > 1.0 && below < 1.0 + 2e-9);
    }

    /// Two dephasings p, q act as p + q − 2pq (0.03 and 0.05 as 0.077): the
    /// product of the two Bloch factors.
    #[test]
    fn two_dephasings_combine() {
        let (p, q) = (0.03, 0.05);
        let combined: f64 = p + q - 2.0 * p * q;
        assert!((combined - 0.077).abs() < 1e-15);
        let site = RotationSite::new(FRAC_PI_4, combined);
        let coherence: Complex64 = site
            .members
            .iter()
            .map(|m| m.probability * Complex64::from_polar(1.0, m.angle))
            .sum();
        assert!((coherence.norm() - (1.0 - 2.0 * p) * (1.0 - 2.0 * q)).abs() < 1e-14);
    }
}
