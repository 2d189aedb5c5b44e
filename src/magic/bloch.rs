//! Bloch vectors, the pure states they name, and the octant they lie in.
//!
//! The six one-qubit stabiliser states sit on the axes, so the extent of a
//! state depends only on the absolute values of its components: everything is
//! computed for x ≥ y ≥ z ≥ 0 and carried back by a signed permutation. Half of
//! these are reflections, which no gate performs; carrying *vectors* back is
//! allowed all the same, because a splitting is solved afterwards, in the
//! octant the state really lies in.
//!
//! Knows nothing of noise or circuits.

use num_complex::Complex64;

use super::site::Stabiliser;

/// Bloch vector (x, y, z) of a one-qubit state, of length at most 1.
pub type Bloch = [f64; 3];

/// Scalar product.
pub(super) fn dot(a: Bloch, b: Bloch) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// a + t·b.
pub(super) fn along(a: Bloch, t: f64, b: Bloch) -> Bloch {
    [a[0] + t * b[0], a[1] + t * b[1], a[2] + t * b[2]]
}

/// The vector scaled to length 1.
pub(super) fn unit(a: Bloch) -> Bloch {
    let length = dot(a, a).sqrt();
    [a[0] / length, a[1] / length, a[2] / length]
}

/// Normalised amplitudes of |0⟩ and |1⟩ of the pure state with this unit Bloch
/// vector. The larger of the two amplitudes is real and positive.
pub fn amplitudes(bloch: Bloch) -> [Complex64; 2] {
    let [x, y, z] = bloch;
    // Both forms are the same state; each is free of cancellation in its half.
    let raw = if z >= 0.0 {
        [Complex64::new(1.0 + z, 0.0), Complex64::new(x, y)]
    } else {
        [Complex64::new(x, -y), Complex64::new(1.0 - z, 0.0)]
    };
    let norm = (raw[0].norm_sqr() + raw[1].norm_sqr()).sqrt();
    [raw[0] / norm, raw[1] / norm]
}

/// Bloch vector of a normalised pure state.
pub fn of_amplitudes(state: [Complex64; 2]) -> Bloch {
    let off_diagonal = state[0].conj() * state[1];
    [
        2.0 * off_diagonal.re,
        2.0 * off_diagonal.im,
        state[0].norm_sqr() - state[1].norm_sqr(),
    ]
}

/// ⟨a|b⟩.
pub(super) fn overlap(a: [Complex64; 2], b: [Complex64; 2]) -> Complex64 {
    a[0].conj() * b[0] + a[1].conj() * b[1]
}

/// The signed permutation that sorts the absolute values of a vector.
#[derive(Debug, Clone, Copy)]
pub(super) struct Octant {
    /// `order[i]` is the axis of the i-th largest absolute value.
    order: [usize; 3],
    /// Whether each axis (not sorted) points the negative way.
    negative: [bool; 3],
}

impl Octant {
    /// The octant of a vector. Ties keep the order x, y, z; zero counts as
    /// positive.
    pub(super) fn of(bloch: Bloch) -> Octant {
        let mut order = [0, 1, 2];
        order.sort_by(|&a, &b| bloch[b].abs().total_cmp(&bloch[a].abs()));
        Octant {
            order,
            negative: bloch.map(|component| component < 0.0),
        }
    }

    /// Absolute values of a vector of this octant, largest first.
    pub(super) fn sorted(&self, bloch: Bloch) -> Bloch {
        self.order.map(|axis| self.sign(axis) * bloch[axis])
    }

    /// The inverse of [`Octant::sorted`].
    pub(super) fn restored(&self, sorted: Bloch) -> Bloch {
        let mut bloch = [0.0; 3];
        for (component, axis) in sorted.into_iter().zip(self.order) {
            bloch[axis] = self.sign(axis) * component;
        }
        bloch
    }

    /// The stabiliser state on this octant's end of the axis that comes
    /// `rank`-th in size, `rank` in 0…2.
    pub(super) fn stabiliser(&self, rank: usize) -> Stabiliser {
        let axis = self.order[rank];
        Stabiliser::on_axis(axis, self.negative[axis])
    }

    fn sign(&self, axis: usize) -> f64 {
        if self.negative[axis] { -1.0 } else { 1.0 }
    }
}

impl Stabiliser {
    /// The eigenstate of X, Y or Z (`axis` 0, 1, 2) with eigenvalue +1, or −1
    /// if `negative`.
    pub fn on_axis(axis: usize, negative: bool) -> Stabiliser {
        match (axis, negative) {
            (0, false) => Stabiliser::Plus,
            (0, true) => Stabiliser::Minus,
            (1, false) => Stabiliser::PlusI,
            (1, true) => Stabiliser::MinusI,
            (_, false) => Stabiliser::Zero,
            (_, true) => Stabiliser::One,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn stabiliser_states_have_the_bloch_vector_of_their_axis() {
        for axis in 0..3 {
            for negative in [false, true] {
                let mut expected = [0.0; 3];
                expected[axis] = if negative { -1.0 } else { 1.0 };
                let found = of_amplitudes(Stabiliser::on_axis(axis, negative).amplitudes());
                for i in 0..3 {
                    assert!((found[i] - expected[i]).abs() < 1e-15);
                }
            }
        }
    }

    #[test]
    fn sorting_is_undone_in_all_48_chambers() {
        for order in [
            [0, 1, 2],
            [0, 2, 1],
            [1, 0, 2],
            [1, 2, 0],
            [2, 0, 1],
            [2, 1, 0],
        ] {
            for signs in 0..8 {
                let mut vector = [0.0; 3];
                for (rank, &axis) in order.iter().enumerate() {
                    let size = [0.6, 0.5, 0.2][rank];
                    vector[axis] = if signs >> axis & 1 == 1 { -size } else { size };
                }
                let octant = Octant::of(vector);
                assert_eq!(octant.sorted(vector), [0.6, 0.5, 0.2]);
                assert_eq!(octant.restored([0.6, 0.5, 0.2]), vector);
                let largest = of_amplitudes(octant.stabiliser(0).amplitudes());
                assert!(dot(largest, vector) > 0.6 - 1e-12);
            }
        }
    }
}
