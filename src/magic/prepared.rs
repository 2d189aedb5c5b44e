//! Prepared sites: the exact mixed state of a fresh qubit as an equal-extent
//! ensemble of split pure states.

use num_complex::Complex64;

use super::bloch::{Bloch, Octant, dot, unit};
use super::extent::{self, Region};
use super::site::{PreparedMember, PreparedSite, Stabiliser};
use super::{ensemble, splitting};

impl PreparedSite {
    /// The site of a qubit with this Bloch vector (x, y, z).
    ///
    /// Every member has the extent of the state, see [`PreparedSite::extent`];
    /// chance times Bloch vector, added over the members, gives the vector back
    /// to 1e-12. A vector longer than 1 is shortened to 1: that is rounding, as
    /// no state has one.
    pub fn new(bloch: Bloch) -> PreparedSite {
        let length_squared = dot(bloch, bloch);
        debug_assert!(
            length_squared <= 1.0 + 2e-9,
            "a Bloch vector is at most 1 long, found {bloch:?}"
        );
        let bloch = if length_squared > 1.0 {
            unit(bloch)
        } else {
            bloch
        };

        let octant = Octant::of(bloch);
        let sorted = octant.sorted(bloch);
        let members = match Region::of(sorted) {
            Region::Mixture => mixture(bloch),
            Region::Edge => ensemble::edge(sorted)
                .into_iter()
                .filter(|&(probability, _)| probability > 0.0)
                .map(|(p, state)| splitting::edge(p, octant.restored(state), &octant))
                .collect(),
            Region::Face { least } => ensemble::face(sorted, least)
                .into_iter()
                .filter(|&(probability, _)| probability > 0.0)
                .map(|(p, state)| splitting::face(p, octant.restored(state), &octant))
                .collect(),
        };
        PreparedSite {
            bloch,
            ideal: bloch,
            members,
        }
    }

    /// The same; `ideal` is the Bloch vector had there been no noise.
    pub fn with_ideal(bloch: Bloch, ideal: Bloch) -> PreparedSite {
        PreparedSite {
            ideal,
            ..PreparedSite::new(bloch)
        }
    }

    /// Extent Ξ of the state, the (Σ|weight|)² of every member: 1 to 3 − √3.
    pub fn extent(&self) -> f64 {
        extent::of_state(self.bloch)
    }
}

/// Mixture of the six stabiliser states, for Σ|r_i| ≤ 1. What is left over goes
/// to |0⟩ and |1⟩ alike, the two that cost a simulation least.
fn mixture(bloch: Bloch) -> Vec<PreparedMember> {
    let sum = bloch[0].abs() + bloch[1].abs() + bloch[2].abs();
    // Above 1 only by rounding.
    let scale = if sum > 1.0 { 1.0 / sum } else { 1.0 };
    let left_over = 0.5 * (1.0 - sum).max(0.0);
    let mut members = Vec::with_capacity(4);
    for (axis, component) in bloch.into_iter().enumerate() {
        for negative in [false, true] {
            let part = if negative { -component } else { component };
            let share = if axis == 2 { left_over } else { 0.0 };
            let probability = part.max(0.0) * scale + share;
            if probability > 0.0 {
                let stabiliser = Stabiliser::on_axis(axis, negative);
                members.push(PreparedMember {
                    probability,
                    state: stabiliser.amplitudes(),
                    components: vec![(stabiliser, Complex64::new(1.0, 0.0))],
                });
            }
        }
    }
    members
}

#[cfg(test)]
mod tests {
    use std::f64::consts::{FRAC_1_SQRT_2, PI};

    use rand::{RngExt, SeedableRng};
    use rand_pcg::Pcg64;

    use super::super::bloch::{amplitudes, of_amplitudes, overlap};
    use super::super::extent::INVERSE_SQRT_3;
    use super::super::site::RotationSite;
    use super::*;

    const T_AXIS: Bloch = [FRAC_1_SQRT_2, FRAC_1_SQRT_2, 0.0];
    const FACE_AXIS: Bloch = [INVERSE_SQRT_3; 3];

    fn scaled(axis: Bloch, length: f64) -> Bloch {
        axis.map(|component| length * component)
    }

    fn sum_of_moduli(member: &PreparedMember) -> f64 {
        member.components.iter().map(|(_, w)| w.norm()).sum()
    }

    /// Largest value of the witnesses: the positive operator with Bloch vector n
    /// scaled by 1/F, F = (1 + max|n_i|)/2 its largest value on a stabiliser
    /// state, gives ⟨W⟩ = (1 + n·r)/(1 + max|n_i|) ≤ Ξ (PRX Quantum 2, 010345
    /// (2021)). Found numerically: the best n with max|n_i| = m is r lengthened
    /// to 1 and cut off at m, and the value has one maximum in m. No formula of
    /// the extent is used.
    fn best_witness(bloch: Bloch) -> f64 {
        let sizes = bloch.map(f64::abs);
        let value = |m: f64| {
            let cut = |factor: f64| sizes.map(|size| (factor * size).min(m));
            let (mut low, mut high) = (0.0, 1e9);
            for _ in 0..120 {
                let middle = 0.5 * (low + high);
                let n = cut(middle);
                if dot(n, n) <= 1.0 {
                    low = middle;
                } else {
                    high = middle;
                }
            }
            (1.0 + dot(cut(low), sizes)) / (1.0 + m)
        };
        let (mut low, mut high) = (0.0, 1.0);
        for _ in 0..120 {
            let (a, b) = ((2.0 * low + high) / 3.0, (low + 2.0 * high) / 3.0);
            if value(a) < value(b) {
                low = a;
            } else {
                high = b;
            }
        }
        value(0.5 * (low + high)).max(1.0)
    }

    /// All that is promised of a site.
    fn check(bloch: Bloch) -> PreparedSite {
        let site = PreparedSite::new(bloch);
        let extent = site.extent();
        let mut total = 0.0;
        let mut mean = [0.0; 3];
        // Bloch vector of the mixture Σ p Σ |c|/Σ|c| · component.
        let mut stabiliser_mixture = [0.0; 3];
        for member in &site.members {
            assert!(member.probability > 0.0, "{bloch:?}");
            total += member.probability;
            assert!((overlap(member.state, member.state).re - 1.0).abs() < 1e-14);
            let vector = of_amplitudes(member.state);
            let sum = sum_of_moduli(member);
            let mut state = [Complex64::new(0.0, 0.0); 2];
            for &(component, weight) in &member.components {
                let part = component.amplitudes();
                state[0] += weight * part[0];
                state[1] += weight * part[1];
                let share = member.probability * weight.norm() / sum;
                for (total, x) in stabiliser_mixture.iter_mut().zip(of_amplitudes(part)) {
                    *total += share * x;
                }
            }
            for (found, expected) in state.iter().zip(member.state) {
                assert!((found - expected).norm() < 1e-13, "{bloch:?}");
            }
            assert!((sum * sum - extent).abs() < 1e-12, "{bloch:?}: {member:?}");
            for i in 0..3 {
                mean[i] += member.probability * vector[i];
            }
        }
        assert!((total - 1.0).abs() < 1e-13, "{bloch:?}");
        for i in 0..3 {
            assert!((mean[i] - bloch[i]).abs() < 1e-12, "{bloch:?}: {mean:?}");
        }
        // Ξ is reached: Ξ·σ − ρ has no negative eigenvalue. Halved trace Ξ − 1,
        // Bloch part Ξ·s − r.
        let gap: Bloch = [0, 1, 2].map(|i| extent * stabiliser_mixture[i] - bloch[i]);
        let least_eigenvalue = 0.5 * (extent - 1.0 - dot(gap, gap).sqrt());
        assert!(least_eigenvalue > -1e-12, "{bloch:?}: {least_eigenvalue}");
        site
    }

    /// Uniform directions; lengths uniform, or 1, or just outside the octahedron.
    fn random_vector(rng: &mut Pcg64, kind: u32) -> Bloch {
        let z = 2.0 * rng.random::<f64>() - 1.0;
        let phi = 2.0 * PI * rng.random::<f64>();
        let rest = (1.0 - z * z).sqrt();
        let axis = [rest * phi.cos(), rest * phi.sin(), z];
        let to_octahedron = 1.0 / (axis[0].abs() + axis[1].abs() + axis[2].abs());
        let u = rng.random::<f64>();
        match kind {
            0 => scaled(axis, u),
            1 => scaled(axis, to_octahedron + u * (1.0 - to_octahedron)),
            2 => axis,
            _ => scaled(axis, (to_octahedron * (1.0 + 1e-9 * u)).min(1.0)),
        }
    }

    #[test]
    fn ensembles_of_20000_random_states() {
        let mut rng = Pcg64::seed_from_u64(1);
        let mut three_members = 0;
        for i in 0..20_000 {
            let site = check(random_vector(&mut rng, i % 4));
            three_members += usize::from(site.members.len() == 3);
        }
        // The rarest branch was really taken.
        assert!(three_members > 500, "{three_members}");
    }

    /// The extent is neither too small (no witness exceeds it) nor too large (a
    /// witness reaches it); that it can be reached is part of `check`.
    #[test]
    fn witnesses_meet_the_extent() {
        let mut rng = Pcg64::seed_from_u64(2);
        for i in 0..1_000 {
            let bloch = random_vector(&mut rng, i % 4);
            let (bound, extent) = (best_witness(bloch), check(bloch).extent());
            assert!(bound < extent + 1e-12, "{bloch:?}: {bound} > {extent}");
            assert!(bound > extent - 1e-12, "{bloch:?}: {bound} < {extent}");
        }
    }

    #[test]
    fn ensembles_of_border_cases() {
        for tiny in [0.0, 1e-300, 1e-17, 1e-16, 1e-15, 1e-12, 1e-9, 1e-6] {
            for sign in [-1.0, 1.0] {
                let e = sign * tiny;
                check([e, 0.0, 0.0]);
                check([0.0, 0.0, unit([1.0, e, e])[0]]);
                check(unit([1.0, e, 0.0]));
                check(unit([e, -1.0, e]));
                check(unit([1.0, 1.0, e]));
                check(unit([-1.0, 1.0 + e, 1.0]));
                check(scaled(unit([-1.0, 1.0 + e, 1.0]), 1.0 - tiny));
                check(scaled(unit([1.0, e, -1.0]), 1.0 - tiny));
                check(scaled(unit([1.0, 0.5, 0.2]), 1.0 - tiny));
                check([0.5, 0.3, 0.2 + e]);
                check([0.5 + e, -0.5, 0.0]);
                check([1.0 / 3.0 + e, 1.0 / 3.0, 1.0 / 3.0]);
            }
        }
        // Exactly on the border of edge and face, r3 = m0.
        for (r1, r2) in [(0.6, 0.6), (0.9, 0.3), (0.7, 0.55)] {
            let border: f64 = (r1 + r2 - 1.0) / (2.0 + 3f64.sqrt());
            for offset in [-1e-6, -1e-12, -1e-15, 0.0, 1e-15, 1e-12, 1e-6] {
                check([r1, r2, border + offset]);
                check([-(border + offset), r2, -r1]);
            }
        }
    }

    #[test]
    fn zero_vector_is_an_equal_mixture() {
        let site = check([0.0; 3]);
        assert_eq!(site.members.len(), 2);
        assert_eq!(site.extent(), 1.0);
    }

    #[test]
    fn vectors_longer_than_one_by_rounding_are_shortened() {
        let site = PreparedSite::new([0.6 + 1e-10, 0.8, 0.0]);
        assert!(dot(site.bloch, site.bloch) <= 1.0 + 1e-15);
        assert_eq!(site.members.len(), 1);
    }

    #[test]
    #[cfg(debug_assertions)]
    #[should_panic(expected = "at most 1 long")]
    fn vectors_far_too_long_are_a_bug() {
        let _ = PreparedSite::new([1.0, 0.1, 0.0]);
    }

    /// Quantum 3, 181 (2019), arXiv:1808.00128, for the first; 3 − √3 from
    /// memory, the state from Phys. Rev. A 71, 022316 (2005). Both recomputed
    /// as 1/F, F the largest squared overlap with a stabiliser state.
    #[test]
    fn extents_of_the_pure_magic_states() {
        assert!((check(T_AXIS).extent() / 1.171572875254 - 1.0).abs() < 1e-12);
        let face = check(FACE_AXIS);
        assert!((face.extent() / 1.267949192431 - 1.0).abs() < 1e-12);
        assert!((face.extent() - (3.0 - 3f64.sqrt())).abs() < 1e-14);
        // Three nearest stabiliser states, equal weights 0.375344166.
        assert_eq!(face.members.len(), 1);
        for (_, weight) in &face.members[0].components {
            assert!((weight.norm() - 0.375344166).abs() < 1e-9);
        }
    }

    /// ry(arccos(1/√3)) then rz(π/4) on |0⟩ is the face-type state; Phys. Rev. A
    /// 71, 022316 (2005).
    #[test]
    fn face_type_state_from_rotations() {
        let theta: f64 = 0.95531661812;
        let state = [
            Complex64::new((0.5 * theta).cos(), 0.0),
            Complex64::from_polar((0.5 * theta).sin(), PI / 4.0),
        ];
        let bloch = of_amplitudes(state);
        for component in bloch {
            assert!((component - INVERSE_SQRT_3).abs() < 1e-11);
        }
        assert!((overlap(amplitudes(bloch), state).norm() - 1.0).abs() < 1e-14);
    }

    /// (1+r)/2 divided by F, r = 1 − 4p/3, never below 1: PRX Quantum 2, 010345
    /// (2021), from memory; recomputed by a primal and a dual bound that agree to
    /// 1e-12.
    #[test]
    fn extents_of_depolarised_magic_states() {
        for (p, extent) in [
            (0.02, 1.155951903584),
            (0.1, 1.093468016904),
            (0.2, 1.015363158553),
            (0.22, 1.0),
            (0.75, 1.0),
        ] {
            let site = check(scaled(T_AXIS, 1.0 - 4.0 * p / 3.0));
            assert!((site.extent() / extent - 1.0).abs() < 1e-12, "p = {p}");
        }
        for (p, extent) in [
            (0.02, 1.251043203199),
            (0.1, 1.183419246269),
            (0.3, 1.014359353945),
            (0.32, 1.0),
        ] {
            let site = check(scaled(FACE_AXIS, 1.0 - 4.0 * p / 3.0));
            assert!((site.extent() / extent - 1.0).abs() < 1e-12, "p = {p}");
        }
    }

    /// The octahedron |x|+|y|+|z| ≤ 1 is reached at p = (3/4)(1 − 1/√2) along a
    /// T axis and (3/4)(1 − 1/√3) along a face axis. PRX Quantum 2, 010345
    /// (2021), from memory.
    #[test]
    fn thresholds_of_depolarised_magic_states() {
        for (axis, threshold, closed_form) in [
            (T_AXIS, 0.219669914110, 0.75 * (1.0 - FRAC_1_SQRT_2)),
            (FACE_AXIS, 0.316987298108, 0.75 * (1.0 - INVERSE_SQRT_3)),
        ] {
            assert!((closed_form - threshold).abs() < 1e-12_f64);
            let at = |p: f64| check(scaled(axis, 1.0 - 4.0 * p / 3.0)).extent();
            assert_eq!(at(closed_form + 1e-9), 1.0);
            assert!(at(closed_form - 1e-9) > 1.0);
            assert!(at(closed_form - 1e-9) < 1.0 + 2e-9);
        }
    }

    /// A dephased rotation on |+⟩ as a state: the same extent as the gate.
    #[test]
    fn states_agree_with_rotations() {
        for i in 1..40 {
            for j in 0..20 {
                let (angle, q) = (PI / 80.0 * f64::from(i), 0.02 * f64::from(j));
                let (sin, cos) = angle.sin_cos();
                let length = 1.0 - 2.0 * q;
                let state = check([length * cos, length * sin, 0.0]);
                let gate = RotationSite::new(angle, q);
                assert!((state.extent() - gate.extent()).abs() < 1e-14);
            }
        }
    }

    /// A T *gate* on any state, then depolarizing p, is with probability
    /// 1 − 2p/3 a T dephased by q = (p/3)/(1 − 2p/3), otherwise X after a T
    /// dephased by 1/2. Mean extent (1−p)·1.171572875254 + 2p/3. Superoperator
    /// identity, residual 2.5e-16.
    #[test]
    fn t_gate_then_depolarizing() {
        for (p, extent) in [(0.01, 1.166523813), (0.1, 1.121082254)] {
            let rest = 2.0 * p / 3.0;
            let clean = RotationSite::new(PI / 4.0, p / 3.0 / (1.0 - rest)).extent();
            let flipped = RotationSite::new(PI / 4.0, 0.5).extent();
            assert_eq!(flipped, 1.0);
            let mean: f64 = (1.0 - rest) * clean + rest * flipped;
            assert!((mean / extent - 1.0).abs() < 1e-9);
        }
    }
}
