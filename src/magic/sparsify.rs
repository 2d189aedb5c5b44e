//! Drawing members and terms: a set of component strings with weights.
//!
//! A *term* is a choice of one component for every site. With c_b the weights of
//! the drawn member of a site, term j picks component b with chance |c_b|/Σ|c|,
//! independently for every site, and its weight is (√ξ/k)·∏ phase(c_b). The sum
//! of the terms has the mean ψ; its law is that of [`super::mixing`]. PRX Quantum
//! 2, 010345 (2021); Quantum 3, 181 (2019).
//!
//! Who uses a [`Draw`] may rely on the sum it stands for, and on nothing about
//! how its strings hang together: other ways to draw them (cosets of a code) give
//! sets that are not independent.
//!
//! Knows nothing of frames or of the state a term becomes.

use num_complex::Complex64;
use rand::Rng;
use smallvec::SmallVec;

use super::site::{CczSite, Site, SiteKind};

/// One draw: the member of every site and the strings of all terms. Reused from
/// shot to shot, so that drawing does not allocate.
#[derive(Debug, Clone, Default)]
pub struct Draw {
    /// The member drawn for every site, an index into its list (0 for a CCZ).
    pub members: Vec<u16>,
    /// Number of terms k.
    pub terms: usize,
    /// The component of every site in every term: for a rotation the power of
    /// diag(1, i), 0…3; for a CCZ b of [`CczSite::component`], 0…7; for a
    /// prepared qubit the index into the member's components.
    pub components: Components,
    /// Modulus √ξ/k of every term's weight.
    pub modulus: f64,
    /// log ξ that the modulus belongs to; 0 for a companion.
    pub log_extent: f64,
}

impl Draw {
    /// An empty draw.
    pub fn new() -> Draw {
        Draw::default()
    }

    /// The member drawn for a site.
    pub fn member(&self, site: u32) -> usize {
        usize::from(self.members[site as usize])
    }

    /// The component of `site` in one term.
    pub fn component(&self, site: usize, term: usize) -> u8 {
        self.components.at(site, term)
    }

    /// Weight of a term: the modulus times the phases of its components'
    /// weights. `sites` are those the draw was made for.
    pub fn weight(&self, sites: &[Site], term: usize) -> Complex64 {
        let phases = sites.iter().enumerate().map(|(index, site)| {
            let factors = site.factors(self.member(index as u32));
            let factor = factors[usize::from(self.component(index, term))];
            factor / factor.norm()
        });
        self.modulus * phases.product::<Complex64>()
    }
}

/// Components in bit planes: a plane has one bit of one site's component for
/// every term, bit j mod 64 of word j / 64 for term j. Bits past the last term
/// mean nothing.
#[derive(Debug, Default)]
pub struct Components {
    bits: Vec<u64>,
    /// Words of a plane.
    words: usize,
    /// First plane of every site, and the number of planes at the end.
    first: Vec<u32>,
}

impl Clone for Components {
    fn clone(&self) -> Self {
        Components {
            bits: self.bits.clone(),
            words: self.words,
            first: self.first.clone(),
        }
    }

    // The derived one would allocate.
    fn clone_from(&mut self, source: &Self) {
        self.bits.clone_from(&source.bits);
        self.words = source.words;
        self.first.clone_from(&source.first);
    }
}

impl Components {
    fn clear(&mut self, terms: usize) {
        self.bits.clear();
        self.words = terms.div_ceil(64);
        self.first.clear();
        self.first.push(0);
    }

    /// Planes of the next site.
    fn push(&mut self, planes: usize) -> &mut [u64] {
        let start = self.bits.len();
        self.bits.resize(start + planes * self.words, 0);
        let last = self.first[self.first.len() - 1];
        self.first.push(last + planes as u32);
        &mut self.bits[start..]
    }

    /// All planes one after another.
    pub fn bits(&self) -> &[u64] {
        &self.bits
    }

    /// Words of a plane.
    pub fn words(&self) -> usize {
        self.words
    }

    /// The first plane of a site, and how many it has. Plane c has bit c.
    pub fn planes(&self, site: usize) -> (usize, usize) {
        let (first, end) = (self.first[site], self.first[site + 1]);
        (first as usize, (end - first) as usize)
    }

    /// How many planes there are.
    pub fn count(&self) -> usize {
        self.bits.len().checked_div(self.words).unwrap_or(0)
    }

    /// Adds a plane that belongs to no site; its index. What it holds is to be
    /// written.
    pub fn add_plane(&mut self) -> usize {
        let index = self.count();
        self.bits.resize(self.bits.len() + self.words, 0);
        index
    }

    /// Forgets the planes from this index on.
    pub fn truncate(&mut self, planes: usize) {
        self.bits.truncate(planes * self.words);
    }

    /// One plane.
    pub fn plane(&self, index: usize) -> &[u64] {
        &self.bits[index * self.words..][..self.words]
    }

    /// A plane to be written anew.
    pub fn plane_mut(&mut self, index: usize) -> &mut [u64] {
        &mut self.bits[index * self.words..][..self.words]
    }

    /// The component of a site in a term.
    pub fn at(&self, site: usize, term: usize) -> u8 {
        let (first, count) = self.planes(site);
        (0..count).fold(0, |component, plane| {
            let word = self.bits[(first + plane) * self.words + term / 64];
            component | ((word >> (term % 64) & 1) as u8) << plane
        })
    }
}

/// Fills a plane with bits that are 1 with chance 1 − threshold·2^−64.
///
/// Bit by bit from the highest a uniform number of 64 bits is compared with the
/// threshold, for 64 terms at a time; after a few bits all of them are decided.
pub fn draw_plane<R: Rng + ?Sized>(threshold: u64, rng: &mut R, plane: &mut [u64]) {
    for word in plane {
        let (mut ones, mut open) = (0, !0u64);
        let mut left = threshold;
        // Numbers equal so far are at least the threshold once only 0s are left of it.
        while open != 0 && left != 0 {
            let drawn = rng.next_u64();
            if left >> 63 == 1 {
                open &= drawn;
            } else {
                ones |= open & drawn;
                open &= !drawn;
            }
            left <<= 1;
        }
        *word = ones | open;
    }
}

/// Draws members and terms for a list of sites.
#[derive(Debug, Clone)]
pub struct Sparsifier {
    sites: Vec<Ensemble>,
    log_extent: f64,
}

impl Sparsifier {
    /// Tables for these sites; the site index in a [`Draw`] is the position in
    /// this list. Leave out sites that turn out not to matter: they would add to
    /// the extent.
    pub fn new<'a>(sites: impl IntoIterator<Item = &'a Site>) -> Sparsifier {
        let mut log_extent = 0.0;
        let sites = sites
            .into_iter()
            .map(|site| {
                log_extent += site.extent.ln();
                Ensemble::of(&site.kind)
            })
            .collect();
        Sparsifier { sites, log_extent }
    }

    /// log ξ of all sites together.
    pub fn log_extent(&self) -> f64 {
        self.log_extent
    }

    /// Draws the member of every site.
    pub fn draw_members<R: Rng + ?Sized>(&self, rng: &mut R, draw: &mut Draw) {
        draw.members.clear();
        draw.members.extend(self.sites.iter().map(|site| {
            if site.thresholds.is_empty() {
                0
            } else {
                below(&site.thresholds, rng.next_u64()) as u16
            }
        }));
    }

    /// Draws `terms` (at least 1) terms for the members already in `draw`, which
    /// come from [`Sparsifier::draw_members`].
    pub fn draw_terms<R: Rng + ?Sized>(&self, terms: usize, rng: &mut R, draw: &mut Draw) {
        // √ξ is out of reach of any number of terms long before it overflows.
        let modulus = (0.5 * self.log_extent).min(700.0).exp() / terms as f64;
        self.fill(terms, modulus, rng, draw);
        draw.log_extent = self.log_extent;
    }

    /// Draws members and one term of weight modulus 1: the companion, the circuit
    /// with every site replaced by a random one of its components.
    pub fn draw_companion<R: Rng + ?Sized>(&self, rng: &mut R, draw: &mut Draw) {
        self.draw_members(rng, draw);
        self.fill(1, 1.0, rng, draw);
        draw.log_extent = 0.0;
    }

    fn fill<R: Rng + ?Sized>(&self, terms: usize, modulus: f64, rng: &mut R, draw: &mut Draw) {
        debug_assert!(terms > 0, "at least one term is needed");
        debug_assert_eq!(draw.members.len(), self.sites.len());
        draw.terms = terms;
        draw.modulus = modulus;
        draw.components.clear(terms);
        for (site, &member) in self.sites.iter().zip(&draw.members) {
            let planes = draw.components.push(site.planes);
            site.members[usize::from(member)].fill(rng, terms, planes);
        }
    }
}

/// The members of a site, ready to draw from.
#[derive(Debug, Clone)]
struct Ensemble {
    /// Bits of a component.
    planes: usize,
    /// Cumulative chances of all members but the last, in units of 2^−64.
    thresholds: SmallVec<[u64; 3]>,
    members: SmallVec<[Splitting; 2]>,
}

impl Ensemble {
    fn of(kind: &SiteKind) -> Ensemble {
        match kind {
            SiteKind::Rotation(site) => Ensemble::from_members(
                site.members
                    .iter()
                    .map(|member| (member.probability, Splitting::of(&member.weights))),
            ),
            SiteKind::Ccz(CczSite) => Ensemble::from_members([(1.0, Splitting::EightEqual)]),
            SiteKind::Prepared(site) => Ensemble::from_members(site.members.iter().map(|member| {
                let weights: SmallVec<[Complex64; 3]> = member
                    .components
                    .iter()
                    .map(|&(_, weight)| weight)
                    .collect();
                (member.probability, Splitting::of(&weights))
            })),
        }
    }

    fn from_members(members: impl IntoIterator<Item = (f64, Splitting)>) -> Ensemble {
        let (chances, members): (SmallVec<[f64; 4]>, SmallVec<[Splitting; 2]>) =
            members.into_iter().unzip();
        let planes = members.iter().map(Splitting::planes).max().unwrap_or(0);
        Ensemble {
            planes,
            thresholds: cumulative(&chances),
            members,
        }
    }
}

/// The components of a member, ready to draw from.
#[derive(Debug, Clone)]
enum Splitting {
    /// Components of different weights; those of weight 0 are left out.
    Weighted {
        /// Cumulative chances of all but the last, in units of 2^−64.
        thresholds: SmallVec<[u64; 3]>,
        /// Component indices.
        choices: SmallVec<[u8; 3]>,
    },
    /// Eight components of equal positive weight, a CCZ.
    EightEqual,
}

impl Splitting {
    fn of(weights: &[Complex64]) -> Splitting {
        let used = || (0u8..).zip(weights).filter(|(_, w)| w.norm() > 0.0);
        let moduli: SmallVec<[f64; 4]> = used().map(|(_, weight)| weight.norm()).collect();
        Splitting::Weighted {
            thresholds: cumulative(&moduli),
            choices: used().map(|(index, _)| index).collect(),
        }
    }

    /// Bits its component indices take.
    fn planes(&self) -> usize {
        let most = match self {
            Splitting::Weighted { choices, .. } => choices.iter().copied().max().unwrap_or(0),
            Splitting::EightEqual => CczSite::COMPONENTS - 1,
        };
        (u8::BITS - most.leading_zeros()) as usize
    }

    /// Draws a component for every term.
    fn fill<R: Rng + ?Sized>(&self, rng: &mut R, terms: usize, planes: &mut [u64]) {
        let words = terms.div_ceil(64);
        match self {
            Splitting::Weighted {
                thresholds,
                choices,
            } => match (thresholds.as_slice(), choices.as_slice()) {
                (&[threshold], [0, 1]) => draw_plane(threshold, rng, &mut planes[..words]),
                ([], [index]) => {
                    for (bit, plane) in planes.chunks_exact_mut(words).enumerate() {
                        plane.fill(u64::from(index >> bit & 1).wrapping_neg());
                    }
                }
                (thresholds, choices) => {
                    for term in 0..terms {
                        let index = choices[below(thresholds, rng.next_u64())];
                        for (bit, plane) in planes.chunks_exact_mut(words).enumerate() {
                            plane[term / 64] |= u64::from(index >> bit & 1) << (term % 64);
                        }
                    }
                }
            },
            Splitting::EightEqual => planes.iter_mut().for_each(|word| *word = rng.next_u64()),
        }
    }
}

/// Cumulative shares of all but the last of these positive weights, in units of
/// 2^−64.
fn cumulative(weights: &[f64]) -> SmallVec<[u64; 3]> {
    let total: f64 = weights.iter().sum();
    let mut sum = 0.0;
    let mut thresholds = SmallVec::new();
    for weight in &weights[..weights.len().saturating_sub(1)] {
        sum += weight;
        // The cast saturates where rounding makes the share 1.
        thresholds.push((sum / total * 2f64.powi(64)) as u64);
    }
    thresholds
}

/// Index of the interval a uniform word falls into.
fn below(thresholds: &[u64], word: u64) -> usize {
    thresholds
        .iter()
        .map(|&threshold| usize::from(word >= threshold))
        .sum()
}

#[cfg(test)]
mod tests;
