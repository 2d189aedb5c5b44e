//! `norm`: not a read-out but an audit: how large is Ω?
//!
//! For k terms drawn freshly and independently, none of them refused,
//! E‖Ω‖² = 1 + (ξ − 1)/k exactly, ξ the extent of the sites met so far. This
//! register takes the terms through the steps up to the first one that reads or
//! damps an active qubit, estimates ‖Ω‖² there by fast norm estimation (Phys.
//! Rev. Lett. 116, 250501 (2016); Quantum 3, 181 (2019)) and stops the shot. A
//! lost phase or a wrong weight anywhere in drawing, splitting or stepping moves
//! the mean of the estimates away from the expected value.
//!
//! Shots that were kept cannot show this: they are kept in proportion to ‖Ω‖².

use crate::magic::{Draw, Site};
use crate::program::Primitive;

use super::probe::{Probe, Settings};
use super::{Diagnostics, Interrupt, Register, ShotRng};

/// Terms on up to 64·W slots, until their sum has been measured.
pub struct Norm<'p, const W: usize> {
    terms: Probe<'p, W>,
    estimate: Option<f64>,
}

impl<'p, const W: usize> Norm<'p, W> {
    /// A register of `slots` slots for these sites; an estimate is the mean over
    /// `probes` random states.
    pub fn new(sites: &'p [Site], slots: usize, probes: usize, interrupt: &'p Interrupt) -> Self {
        let settings = Settings {
            probes,
            ..Settings::single()
        };
        Norm {
            terms: Probe::new(sites, slots, settings, interrupt),
            estimate: None,
        }
    }

    /// The estimate of ‖Ω‖² of the last shot; none if it was interrupted.
    pub fn estimate(&self) -> Option<f64> {
        self.estimate
    }
}

impl<const W: usize> Register for Norm<'_, W> {
    fn start(&mut self, draw: &Draw, rng: &mut ShotRng) -> bool {
        self.estimate = None;
        self.terms.start(draw, rng)
    }

    fn plus(&mut self, slot: u16, rng: &mut ShotRng) {
        self.terms.plus(slot, rng);
    }

    fn prepare(&mut self, slot: u16, site: u32, draw: &Draw) {
        self.terms.prepare(slot, site, draw);
    }

    fn primitive(&mut self, primitive: &Primitive, rng: &mut ShotRng) {
        self.terms.primitive(primitive, rng);
    }

    fn controlled_not(&mut self, control: u16, target: u16) {
        self.terms.controlled_not(control, target);
    }

    fn rotate(&mut self, slot: u16, site: u32, flipped: bool, draw: &Draw, rng: &mut ShotRng) {
        self.terms.rotate(slot, site, flipped, draw, rng);
    }

    fn quarter_turn(&mut self, slot: u16, flipped: bool) {
        self.terms.quarter_turn(slot, flipped);
    }

    fn ccz(&mut self, slots: [u16; 3], flipped: [bool; 3], site: u32, draw: &Draw) {
        self.terms.ccz(slots, flipped, site, draw);
    }

    fn skip(&mut self, site: u32, draw: &Draw, rng: &mut ShotRng) {
        self.terms.skip(site, draw, rng);
    }

    fn controlled_z(&mut self, a: u16, b: u16) {
        self.terms.controlled_z(a, b);
    }

    fn z(&mut self, slot: u16) {
        self.terms.z(slot);
    }

    /// Estimates instead, and stops the shot.
    fn measure(&mut self, slot: u16, rng: &mut ShotRng) -> Option<bool> {
        self.estimate = self.terms.norm(Some(slot), rng);
        None
    }

    /// Estimates instead, and stops the shot.
    fn damp(&mut self, slot: u16, _: bool, _: f64, rng: &mut ShotRng) -> Option<bool> {
        self.estimate = self.terms.norm(Some(slot), rng);
        None
    }

    fn finish(&mut self, rng: &mut ShotRng) -> bool {
        self.estimate = self.terms.norm(None, rng);
        false
    }

    fn diagnostics(&self) -> Diagnostics {
        self.terms.diagnostics()
    }
}
