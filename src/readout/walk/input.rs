//! The start of a shot: input bits, and whether terms and bits go together.
//!
//! The phases of all terms are eighths of a turn but for those of prepared
//! qubits, so they are counted for 64 terms at a time, as numbers modulo 8 in
//! three bit planes. A rotation's component 1 is weighted with a phase e^{−iπ/4}
//! relative to component 0, whatever the angle (c_S/c_I of
//! [`crate::magic::RotationMember`]), and waits with i^y: together one eighth
//! down where the input bit is 0, one up where it is 1.

use std::f64::consts::FRAC_PI_4;

use num_complex::Complex64;
use rand::RngExt;

use crate::magic::{Draw, SiteKind};

use super::settings::{Meeting, meeting};
use super::{ShotRng, Walk};

impl<const W: usize> Walk<'_, W> {
    /// Draws the input bits and starts the terms; false if both are to be drawn
    /// anew.
    pub(super) fn draw_input(&mut self, draw: &Draw, rng: &mut ShotRng) -> bool {
        let from_term = rng.random::<f64>() < self.settings.mixing_weight;
        let term = if from_term {
            rng.random_range(0..draw.terms)
        } else {
            0
        };
        self.input.clear();
        for (index, site) in self.sites.iter().enumerate() {
            let bits = match &site.kind {
                SiteKind::Prepared(prepared) => {
                    let member = &prepared.members[draw.member(index as u32)];
                    let state = if from_term {
                        let component = draw.component(index, term);
                        member.components[usize::from(component)].0.amplitudes()
                    } else {
                        member.state
                    };
                    u8::from(rng.random::<f64>() < state[1].norm_sqr())
                }
                _ => rng.random::<u8>() & 7,
            };
            self.input.push(bits);
        }
        self.count_eighths(draw);
        let (sum, mixed) = if self.settings.prepared {
            self.start_with_prepared(draw)
        } else {
            (self.sum_of_eighths(draw.terms), draw.terms as f64)
        };
        let modulus = self.settings.modulus;
        let ratio = modulus * modulus * sum.norm_sqr()
            / (self.density(draw, mixed) * self.settings.start_cap);
        self.diagnostics.clipped |= ratio > 1.0 + 1e-9;
        if rng.random::<f64>() >= ratio {
            return false;
        }
        if !self.settings.prepared {
            let words = draw.components.words();
            let eighths = &self.eighths;
            self.terms.reset_with(draw.terms, |label| {
                let eighths = number(eighths, words, label);
                (Complex64::new(modulus, 0.0), eighths, 0)
            });
        }
        true
    }

    /// q at the input bits, but for the factor of the uniform ones; `mixed` is
    /// Σ_j |φ_j(z)|² of the prepared qubits.
    fn density(&self, draw: &Draw, mixed: f64) -> f64 {
        let mut ideal = 1.0;
        for (index, site) in self.sites.iter().enumerate() {
            if let SiteKind::Prepared(prepared) = &site.kind {
                let member = &prepared.members[draw.member(index as u32)];
                ideal *= member.state[usize::from(self.input[index])].norm_sqr();
            }
        }
        let weight = self.settings.mixing_weight;
        (1.0 - weight) * ideal + weight * mixed / draw.terms as f64
    }

    /// Phases of weights and pending factors of the gate sites, modulo 8.
    fn count_eighths(&mut self, draw: &Draw) {
        let words = draw.components.words();
        self.eighths.clear();
        self.eighths.resize(3 * words, 0);
        let (ones, rest) = self.eighths.split_at_mut(words);
        let (twos, fours) = rest.split_at_mut(words);
        for (index, site) in self.sites.iter().enumerate() {
            if meeting(site) != Meeting::Input {
                continue;
            }
            let input = self.input[index];
            let (first, count) = draw.components.planes(index);
            match &site.kind {
                SiteKind::Rotation(_) => {
                    // Up and down differ by two eighths.
                    let down = if input & 1 == 0 { !0 } else { 0 };
                    let plane = draw.components.plane(first);
                    for (word, &b) in plane.iter().enumerate() {
                        // b up is + b; b down is + b with all bits, 7 modulo 8.
                        let carry = ones[word] & b;
                        ones[word] ^= b;
                        let both = b & down;
                        let next = (twos[word] & (carry ^ both)) | (carry & both);
                        twos[word] ^= carry ^ both;
                        fours[word] ^= next ^ both;
                    }
                }
                SiteKind::Ccz(_) => {
                    // CCZ(y)·CCZ(y⊕b); the first is common to all terms.
                    debug_assert_eq!(count, 3);
                    let planes: [&[u64]; 3] =
                        std::array::from_fn(|axis| draw.components.plane(first + axis));
                    let flips: [u64; 3] =
                        std::array::from_fn(|axis| if input >> axis & 1 == 1 { !0 } else { 0 });
                    for word in 0..words {
                        fours[word] ^= (planes[0][word] ^ flips[0])
                            & (planes[1][word] ^ flips[1])
                            & (planes[2][word] ^ flips[2]);
                    }
                }
                SiteKind::Prepared(_) => {}
            }
        }
    }

    /// Σ_j e^{iπ/4·eighths} over the terms.
    fn sum_of_eighths(&self, terms: usize) -> Complex64 {
        let words = terms.div_ceil(64);
        let mut counts = [0u64; 8];
        for word in 0..words {
            let planes: [u64; 3] = std::array::from_fn(|plane| self.eighths[plane * words + word]);
            let valid = match terms - 64 * word {
                left @ 0..64 => (1 << left) - 1,
                _ => !0u64,
            };
            for (value, count) in counts.iter_mut().enumerate() {
                let same = planes.iter().enumerate().fold(valid, |same, (bit, plane)| {
                    same & if value >> bit & 1 == 1 {
                        *plane
                    } else {
                        !plane
                    }
                });
                *count += u64::from(same.count_ones());
            }
        }
        let directions = (0..8).map(|n| Complex64::from_polar(1.0, FRAC_PI_4 * f64::from(n)));
        counts
            .iter()
            .zip(directions)
            .map(|(&count, direction)| count as f64 * direction)
            .sum()
    }

    /// Starts the terms where some qubits are prepared. Returns Σ_j of phases and
    /// pending factors, and Σ_j of the squares of the latter.
    fn start_with_prepared(&mut self, draw: &Draw) -> (Complex64, f64) {
        /// Phase times pending amplitude of each component.
        struct Factors {
            first: usize,
            count: usize,
            of: [Complex64; 4],
        }
        let mut prepared = Vec::new();
        for (index, site) in self.sites.iter().enumerate() {
            let SiteKind::Prepared(state) = &site.kind else {
                continue;
            };
            let member = &state.members[draw.member(index as u32)];
            let input = usize::from(self.input[index]);
            let (first, count) = draw.components.planes(index);
            let of = std::array::from_fn(|b| {
                member
                    .components
                    .get(b)
                    .map_or(Complex64::ZERO, |&(stabiliser, weight)| {
                        let size = weight.norm();
                        let phase = if size > 0.0 { weight / size } else { weight };
                        phase * stabiliser.amplitudes()[input]
                    })
            });
            prepared.push(Factors { first, count, of });
        }
        let words = draw.components.words();
        let modulus = self.settings.modulus;
        let (mut sum, mut mixed) = (Complex64::ZERO, 0.0);
        let eighths = &self.eighths;
        self.terms.reset_with(draw.terms, |label| {
            let turns = number(eighths, words, label);
            let (mut weight, mut blocked) = (Complex64::ONE, 0);
            for site in &prepared {
                let component = (0..site.count).fold(0, |component, bit| {
                    let word = draw.components.plane(site.first + bit)[label / 64];
                    component | ((word >> (label % 64) & 1) as usize) << bit
                });
                match site.of[component] {
                    Complex64::ZERO => blocked += 1,
                    factor => weight *= factor,
                }
            }
            if blocked == 0 {
                sum += weight * Complex64::from_polar(1.0, FRAC_PI_4 * f64::from(turns));
                mixed += weight.norm_sqr();
            }
            (modulus * weight, turns, blocked)
        });
        (sum, mixed)
    }
}

/// The number of a term that three planes spell.
fn number(planes: &[u64], words: usize, label: usize) -> u8 {
    (0..3).fold(0, |number, plane| {
        let word = planes[plane * words + label / 64];
        number | ((word >> (label % 64) & 1) as u8) << plane
    })
}
