//! `dense`: the 2^r amplitudes of the active qubits, exactly.
//!
//! No sparsification: a drawn member of each site acts as the gate it is, so
//! the shots follow the ideal law (λ = 0). Cost a step: one pass over 2^r
//! amplitudes.

use num_complex::Complex64;
use rand::RngExt;

use crate::magic::{Draw, Site, SiteKind};
use crate::program::{MAX_SLOTS, Primitive};

use super::{Diagnostics, I_POWERS, Register, ShotRng};

/// Most active qubits this register takes.
pub const MAX_ACTIVE: usize = 28;

/// Bytes of one register of `active` qubits.
pub fn memory(active: usize) -> u128 {
    16u128 << active.min(100)
}

/// Amplitudes of the active slots. Bit p of an index belongs to slot
/// `order[p]`.
#[derive(Debug)]
pub struct Dense<'p> {
    sites: &'p [Site],
    amplitudes: Vec<Complex64>,
    order: Vec<u16>,
    position: [u8; MAX_SLOTS],
}

impl<'p> Dense<'p> {
    /// A register for these sites, with room for `active` qubits.
    pub fn new(sites: &'p [Site], active: usize) -> Self {
        debug_assert!(active <= MAX_ACTIVE);
        let mut amplitudes = Vec::with_capacity(1 << active);
        amplitudes.push(Complex64::ONE);
        Dense {
            sites,
            amplitudes,
            order: Vec::with_capacity(active),
            position: [0; MAX_SLOTS],
        }
    }

    /// The amplitudes; bit p of an index belongs to slot `slots()[p]`.
    pub fn amplitudes(&self) -> &[Complex64] {
        &self.amplitudes
    }

    /// The active slots, in the order of index bits.
    pub fn slots(&self) -> &[u16] {
        &self.order
    }

    fn mask(&self, slot: u16) -> usize {
        1 << self.position[usize::from(slot)]
    }

    /// Index mask of the slots of a wide mask.
    fn gather(&self, wide: &[u64; 4]) -> usize {
        self.order
            .iter()
            .enumerate()
            .map(|(position, &slot)| {
                let slot = usize::from(slot);
                ((wide[slot / 64] >> (slot % 64) & 1) as usize) << position
            })
            .sum()
    }

    /// An idle slot joins in zero·|0⟩ + one·|1⟩.
    fn join(&mut self, slot: u16, zero: Complex64, one: Complex64) {
        self.position[usize::from(slot)] = self.order.len() as u8;
        self.order.push(slot);
        let half = self.amplitudes.len();
        self.amplitudes.resize(2 * half, Complex64::ZERO);
        let (low, high) = self.amplitudes.split_at_mut(half);
        for (low, high) in low.iter_mut().zip(high) {
            *high = *low * one;
            *low *= zero;
        }
    }

    /// Multiplies by `one` where the slot's bit differs from `flipped`.
    fn phase(&mut self, slot: u16, flipped: bool, one: Complex64) {
        let mask = self.mask(slot);
        let offset = if flipped { 0 } else { mask };
        for block in self.amplitudes.chunks_exact_mut(2 * mask) {
            block[offset..offset + mask]
                .iter_mut()
                .for_each(|amplitude| *amplitude *= one);
        }
    }

    /// Changes the sign where index ⊕ flip has all bits of `mask`.
    fn sign(&mut self, mask: usize, flip: usize) {
        for (index, amplitude) in self.amplitudes.iter_mut().enumerate() {
            if (index ^ flip) & mask == mask {
                *amplitude = -*amplitude;
            }
        }
    }

    /// Weights of the slot's values 0 and 1.
    fn weights(&self, slot: u16) -> [f64; 2] {
        let mask = self.mask(slot);
        let mut weights = [0.0; 2];
        for block in self.amplitudes.chunks_exact(2 * mask) {
            let (low, high) = block.split_at(mask);
            weights[0] += low.iter().map(Complex64::norm_sqr).sum::<f64>();
            weights[1] += high.iter().map(Complex64::norm_sqr).sum::<f64>();
        }
        weights
    }

    /// Keeps one value of a slot, scaled, and takes the slot out.
    fn leave(&mut self, slot: u16, value: bool, scale: f64) {
        let position = usize::from(self.position[usize::from(slot)]);
        let mask = 1 << position;
        let half = self.amplitudes.len() / 2;
        let offset = if value { mask } else { 0 };
        for block in 0..half / mask {
            let from = 2 * block * mask + offset;
            for index in 0..mask {
                self.amplitudes[block * mask + index] = self.amplitudes[from + index] * scale;
            }
        }
        self.amplitudes.truncate(half);
        self.order.remove(position);
        for &moved in &self.order[position..] {
            self.position[usize::from(moved)] -= 1;
        }
    }
}

impl Register for Dense<'_> {
    fn start(&mut self, _draw: &Draw, _rng: &mut ShotRng) -> bool {
        self.amplitudes.clear();
        self.amplitudes.push(Complex64::ONE);
        self.order.clear();
        true
    }

    fn plus(&mut self, slot: u16, _rng: &mut ShotRng) {
        let half = Complex64::new(std::f64::consts::FRAC_1_SQRT_2, 0.0);
        self.join(slot, half, half);
    }

    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw) {
        let SiteKind::Prepared(prepared) = &self.sites[site as usize].kind else {
            return;
        };
        let [zero, one] = prepared.members[draw.member(site)].state;
        self.join(slot, zero, one);
    }

    fn primitive(&mut self, primitive: &Primitive, _rng: &mut ShotRng) {
        let (x, z) = (self.gather(&primitive.x), self.gather(&primitive.z));
        let scale = std::f64::consts::FRAC_1_SQRT_2;
        let sign = |index: usize| (index & z).count_ones() as usize * 2;
        let power = |index: usize| I_POWERS[(usize::from(primitive.phase) + sign(index)) & 3];
        if x == 0 {
            for (index, amplitude) in self.amplitudes.iter_mut().enumerate() {
                *amplitude *= (power(index) + 1.0) * scale;
            }
            return;
        }
        // Pairs {y, y⊕x}, each met once: y lacks the highest bit of x.
        let high = 1usize << (usize::BITS - 1 - x.leading_zeros());
        let half = self.amplitudes.len() / 2;
        for counter in 0..half {
            let low = counter & (high - 1);
            let index = ((counter & !(high - 1)) << 1) | low;
            let other = index ^ x;
            let (a, b) = (self.amplitudes[index], self.amplitudes[other]);
            self.amplitudes[index] = (a + power(other) * b) * scale;
            self.amplitudes[other] = (b + power(index) * a) * scale;
        }
    }

    fn controlled_not(&mut self, control: u16, target: u16) {
        let (control, target) = (self.mask(control), self.mask(target));
        for index in 0..self.amplitudes.len() {
            if index & control != 0 && index & target == 0 {
                self.amplitudes.swap(index, index | target);
            }
        }
    }

    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw, _rng: &mut ShotRng) {
        let SiteKind::Rotation(rotation) = &self.sites[site as usize].kind else {
            return;
        };
        let angle = rotation.members[draw.member(site)].angle;
        self.phase(slot, flipped, Complex64::cis(angle));
    }

    fn quarter_turn(&mut self, slot: u16, flipped: bool) {
        self.phase(slot, flipped, Complex64::I);
    }

    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], _site: u32, _draw: &Draw) {
        let (mut mask, mut flip) = (0, 0);
        for (slot, flipped) in slots.into_iter().zip(flipped) {
            let bit = self.mask(slot);
            mask |= bit;
            flip |= if flipped { bit } else { 0 };
        }
        self.sign(mask, flip);
    }

    fn skip(&mut self, _site: u32, _draw: &Draw, _rng: &mut ShotRng) {}

    fn controlled_z(&mut self, a: u16, b: u16) {
        let mask = self.mask(a) | self.mask(b);
        self.sign(mask, 0);
    }

    fn z(&mut self, slot: u16) {
        let mask = self.mask(slot);
        self.sign(mask, 0);
    }

    fn measure(&mut self, slot: u16, rng: &mut ShotRng) -> Option<bool> {
        let weights = self.weights(slot);
        let value = rng.random::<f64>() * (weights[0] + weights[1]) < weights[1];
        self.leave(slot, value, weights[usize::from(value)].sqrt().recip());
        Some(value)
    }

    fn damp(&mut self, slot: u16, flipped: bool, gamma: f64, rng: &mut ShotRng) -> Option<bool> {
        let weights = self.weights(slot);
        let (zero, one) = (
            weights[usize::from(flipped)],
            weights[usize::from(!flipped)],
        );
        let decayed = rng.random::<f64>() * (zero + one) < gamma * one;
        let kept = if decayed {
            one
        } else {
            zero + (1.0 - gamma) * one
        };
        let scale = kept.sqrt().recip();
        let (zero, one) = if decayed {
            (0.0, 1.0)
        } else {
            (1.0, (1.0 - gamma).sqrt())
        };
        self.phase(slot, !flipped, Complex64::new(zero * scale, 0.0));
        self.phase(slot, flipped, Complex64::new(one * scale, 0.0));
        Some(decayed)
    }

    fn finish(&mut self, _rng: &mut ShotRng) -> bool {
        true
    }

    fn diagnostics(&self) -> Diagnostics {
        Diagnostics::default()
    }
}
