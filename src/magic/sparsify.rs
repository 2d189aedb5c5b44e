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
    /// The component of every site in every term, at `site·terms + term`: for a
    /// rotation the power of diag(1, i), 0…3; for a CCZ b of
    /// [`CczSite::component`], 0…7; for a prepared qubit the index into the
    /// member's components.
    pub components: Vec<u8>,
    /// Weight of every term.
    pub weights: Vec<Complex64>,
    /// log ξ that the weights belong to; 0 for a companion.
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

    /// The component of `site` in every term.
    pub fn row(&self, site: usize) -> &[u8] {
        &self.components[site * self.terms..(site + 1) * self.terms]
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
        draw.weights.clear();
        draw.weights.resize(terms, Complex64::new(modulus, 0.0));
        draw.components.clear();
        draw.components.resize(terms * self.sites.len(), 0);
        let rows = draw.components.chunks_exact_mut(terms.max(1));
        for ((site, &member), row) in self.sites.iter().zip(&draw.members).zip(rows) {
            site.members[usize::from(member)].fill(rng, row, &mut draw.weights);
        }
    }
}

/// The members of a site, ready to draw from.
#[derive(Debug, Clone)]
struct Ensemble {
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
        let (chances, members): (SmallVec<[f64; 4]>, _) = members.into_iter().unzip();
        Ensemble {
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
        /// Component index and phase of its weight.
        choices: SmallVec<[(u8, Complex64); 3]>,
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
            choices: used()
                .map(|(index, weight)| (index, weight / weight.norm()))
                .collect(),
        }
    }

    /// Draws a component for every term, and turns the terms' weights by its
    /// phase.
    fn fill<R: Rng + ?Sized>(&self, rng: &mut R, row: &mut [u8], weights: &mut [Complex64]) {
        match self {
            Splitting::Weighted {
                thresholds,
                choices,
            } => match (thresholds.as_slice(), choices.as_slice()) {
                ([], [(index, phase)]) => {
                    row.fill(*index);
                    if *phase != Complex64::new(1.0, 0.0) {
                        weights.iter_mut().for_each(|weight| *weight *= phase);
                    }
                }
                // By far the most frequent, and without a branch.
                (&[threshold], &[first, second]) => {
                    let choices = [first, second];
                    for (component, weight) in row.iter_mut().zip(weights) {
                        let (index, phase) = choices[usize::from(rng.next_u64() >= threshold)];
                        *component = index;
                        *weight *= phase;
                    }
                }
                (thresholds, choices) => {
                    for (component, weight) in row.iter_mut().zip(weights) {
                        let (index, phase) = choices[below(thresholds, rng.next_u64())];
                        *component = index;
                        *weight *= phase;
                    }
                }
            },
            Splitting::EightEqual => {
                // Three bits a component, 21 components a word.
                for chunk in row.chunks_mut(21) {
                    let mut bits = rng.next_u64();
                    for component in chunk {
                        *component = bits as u8 & (CczSite::COMPONENTS - 1);
                        bits >>= 3;
                    }
                }
            }
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
