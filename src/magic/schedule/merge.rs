//! Pauli noise that moves into sites.
//!
//! **Splitting a channel.** For an axis A among the Pauli words of a channel,
//! pair every word P with AP, the identity being a word too. With w the
//! probability of the pair and q = p(AP)/w, the pair acts as "apply P, then
//! dephase about A with probability q" (a sign of AP does not matter). If every
//! pair has q_m ≤ q ≤ 1 − q_m, write q = q_m + q' − 2·q_m·q', q' =
//! (q − q_m)/(1 − 2q_m), which is in [0, 1]: the channel is a dephasing about A
//! by q_m, common to all pairs, and a Pauli channel with q' in place of q. The
//! dephasing commutes with both the rest of the channel and a rotation about A,
//! so it becomes part of the site; two of them, q and r, make q + r − 2qr. For
//! depolarizing p on one qubit and A = Z, q_m = (p/3)/(1 − 2p/3), and with
//! probability 2p/3 an X is left over.
//!
//! **Reaching the site.** The dephasing by q_m is moved to the site through
//! what lies between, its axis changed by Clifford gates, as long as
//! [`dephasing_passes`] says so. Site and channel must depend on the same bit
//! at the same stage of its life, or on none.
//!
//! **Prepared states.** A dephasing about X, Y or Z that moves back to a
//! prepared state shrinks the two other components of its Bloch vector by
//! 1 − 2q.
//!
//! A state dephased once more has no larger extent, as the extent is convex and
//! A maps stabiliser states to such. A site of extent 1 takes no more noise.

use std::collections::HashMap;

use smallvec::smallvec;

use crate::circuit::{Pauli, PauliProduct};
use crate::magic::extent;
use crate::noise::{PauliChannel, PauliChoices, PauliWord};

use super::axis::{as_word, dephasing_passes};
use super::timeline::{Direction, Timeline, Work};
use super::walk::Walk;

/// How many instructions a dephasing moves past before noise from further away
/// is looked at.
const NEAR: usize = 64;

/// The most it moves past at all, where there are few sites.
const FAR: usize = 4096;

/// Instructions looked at from all sites together, in one direction, beyond
/// [`NEAR`]: a second or two.
const BUDGET: usize = 1 << 22;

/// The most letters an axis may grow to on its way.
const WIDEST: usize = 16;

/// A common part below this is rounding.
const ROUNDING: f64 = 1e-15;

/// Moves noise into every site: first that of the site's own statement, which
/// nobody else should take, then what is near, then whatever it can reach.
pub(super) fn absorb(timeline: &mut Timeline) {
    let is_site = |work: &Work| matches!(work, Work::Rotation { .. } | Work::Prepared(_));
    let nodes = timeline.nodes.iter();
    let sites = nodes.filter(|node| is_site(&node.work)).count();
    let far = (BUDGET / sites.max(1)).clamp(NEAR, FAR);
    for (own, reach) in [(true, NEAR), (false, NEAR), (false, far)] {
        for index in 0..timeline.nodes.len() as u32 {
            match &timeline.node(index).work {
                Work::Rotation { axis, .. } => {
                    let axis = axis.clone();
                    for direction in [Direction::Forward, Direction::Backward] {
                        gather(timeline, index, axis.clone(), direction, own, reach);
                    }
                }
                Work::Prepared(prepared) if !own => {
                    let (qubit, bloch) = (prepared.qubit, prepared.bloch);
                    let mut order = [(Pauli::X, 0), (Pauli::Y, 1), (Pauli::Z, 2)];
                    // The smallest component is the axis of the dephasing that helps most.
                    order.sort_by(|&(_, a), &(_, b)| bloch[a].abs().total_cmp(&bloch[b].abs()));
                    for (letter, _) in order {
                        gather(
                            timeline,
                            index,
                            smallvec![(qubit, letter)],
                            Direction::Forward,
                            false,
                            reach,
                        );
                    }
                }
                _ => {}
            }
        }
    }
}

/// Walks from a site and takes into it what its axis allows.
fn gather(
    timeline: &mut Timeline,
    site: u32,
    axis: PauliProduct,
    direction: Direction,
    own: bool,
    reach: usize,
) {
    let (condition, operation) = {
        let node = timeline.node(site);
        (node.condition, node.operation)
    };
    let widest = axis.len().max(WIDEST);
    let mut walk = Walk::new(site, axis.clone(), direction);
    let mut passed = 0;
    while passed < reach
        && !is_stabiliser_mixture(&timeline.node(site).work)
        && let Some(next) = walk.next(timeline)
    {
        let node = timeline.node(next);
        if own && node.operation != operation {
            return;
        }
        if let Work::Pauli(channel) = &node.work
            && node.condition == condition
            && let Some((common, rest)) = split(channel, walk.axis())
        {
            match rest {
                Some(rest) => timeline.nodes[next as usize].work = Work::Pauli(rest),
                None => timeline.remove(next),
            }
            dephase(&mut timeline.nodes[site as usize].work, &axis, common);
        } else {
            passed += 1;
            match dephasing_passes(walk.axis(), node) {
                Some(moved) if moved.len() <= widest => walk.turn(moved, next),
                _ => return,
            }
        }
    }
}

fn is_stabiliser_mixture(work: &Work) -> bool {
    let bloch = match work {
        Work::Rotation {
            angle, dephasing, ..
        } => {
            let length = 1.0 - 2.0 * dephasing;
            [length * angle.cos(), length * angle.sin(), 0.0]
        }
        Work::Prepared(prepared) => prepared.bloch,
        _ => return true,
    };
    extent::of_state(bloch) <= 1.0
}

/// Dephases a site about an axis of its own.
fn dephase(work: &mut Work, axis: &PauliProduct, q: f64) {
    match work {
        Work::Rotation { dephasing, .. } => {
            *dephasing = (*dephasing + q - 2.0 * *dephasing * q).min(0.5);
        }
        Work::Prepared(prepared) => {
            let own = match axis.first() {
                Some((_, Pauli::X)) => 0,
                Some((_, Pauli::Y)) => 1,
                _ => 2,
            };
            for component in (0..3).filter(|&component| component != own) {
                prepared.bloch[component] *= 1.0 - 2.0 * q;
            }
        }
        _ => {}
    }
}

/// The dephasing about `axis` common to all pairs of a channel's words, and
/// what is left of the channel. `None` if there is no common part.
fn split(channel: &PauliChannel, axis: &PauliProduct) -> Option<(f64, Option<PauliChannel>)> {
    let PauliChoices::Listed(words) = &channel.choices else {
        return None;
    };
    let own = as_word(axis, channel)?;
    let total: f64 = words.iter().map(|(_, p)| p).sum();
    let nothing = (1.0 - total).max(0.0);
    let has_own = words.iter().any(|&(word, p)| word == own && p > 0.0);
    if own == PauliWord::default() || has_own != (nothing > 0.0) {
        return None;
    }

    let pairs = pairs(words, own, nothing);
    let common = pairs
        .iter()
        .map(|pair| pair.p.min(pair.partner) / (pair.p + pair.partner))
        .fold(0.5, f64::min);
    if common < ROUNDING {
        return None;
    }
    let rest = rest(&pairs, own, common);
    let left = (!rest.is_empty()).then(|| PauliChannel {
        qubits: channel.qubits.clone(),
        choices: PauliChoices::Listed(rest),
    });
    Some((common, left))
}

/// Two words that differ by the axis, at least one of them possible.
struct Pair {
    word: PauliWord,
    /// Probability of `word`.
    p: f64,
    /// Probability of the axis times `word`.
    partner: f64,
}

fn times(a: PauliWord, b: PauliWord) -> PauliWord {
    PauliWord {
        x: a.x ^ b.x,
        z: a.z ^ b.z,
    }
}

/// The words in pairs, in the order of their first mention; the pair of the
/// identity comes first.
fn pairs(words: &[(PauliWord, f64)], own: PauliWord, nothing: f64) -> Vec<Pair> {
    let identity = (PauliWord::default(), nothing);
    let mut places: HashMap<PauliWord, usize> = HashMap::with_capacity(words.len());
    let mut pairs: Vec<Pair> = Vec::with_capacity(words.len() / 2 + 1);
    for &(word, p) in std::iter::once(&identity).chain(words) {
        if p <= 0.0 {
            continue;
        }
        match places.get(&times(word, own)) {
            Some(&place) => pairs[place].partner += p,
            None => {
                places.insert(word, pairs.len());
                pairs.push(Pair {
                    word,
                    p,
                    partner: 0.0,
                });
            }
        }
    }
    pairs
}

/// The channel without its common dephasing.
fn rest(pairs: &[Pair], own: PauliWord, common: f64) -> Vec<(PauliWord, f64)> {
    let mut rest = Vec::with_capacity(2 * pairs.len());
    for pair in pairs {
        let weight = pair.p + pair.partner;
        // q' − 0 or 1 − q' is computed without cancellation from the smaller part.
        let smaller = pair.p.min(pair.partner) / weight;
        let left = match 1.0 - 2.0 * common {
            scale if scale > ROUNDING => ((smaller - common) / scale).clamp(0.0, 1.0),
            _ => 0.0,
        };
        let left = if left < ROUNDING { 0.0 } else { left };
        let (mostly, seldom) = if pair.p >= pair.partner {
            (pair.word, times(pair.word, own))
        } else {
            (times(pair.word, own), pair.word)
        };
        for (word, p) in [(mostly, weight * (1.0 - left)), (seldom, weight * left)] {
            if word != PauliWord::default() && p > 0.0 {
                rest.push((word, p));
            }
        }
    }
    rest
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::Qubits;

    const X: PauliWord = PauliWord { x: 1, z: 0 };
    const Y: PauliWord = PauliWord { x: 1, z: 1 };
    const Z: PauliWord = PauliWord { x: 0, z: 1 };

    fn channel(words: &[(PauliWord, f64)]) -> PauliChannel {
        PauliChannel {
            qubits: Qubits::from_slice(&[7]),
            choices: PauliChoices::Listed(words.to_vec()),
        }
    }

    fn z_axis() -> PauliProduct {
        smallvec![(7, Pauli::Z)]
    }

    #[test]
    fn depolarizing_leaves_an_x_behind() {
        // Superoperator identity: with probability 1 − 2p/3 a dephasing by
        // (p/3)/(1 − 2p/3), with 2p/3 an X and a full dephasing, of which the
        // common part is taken.
        let p = 0.1;
        let channel = channel(&[(X, p / 3.0), (Y, p / 3.0), (Z, p / 3.0)]);
        let (common, rest) = split(&channel, &z_axis()).unwrap();
        assert!((common - (p / 3.0) / (1.0 - 2.0 * p / 3.0)).abs() < 1e-15);
        let PauliChoices::Listed(rest) = rest.unwrap().choices else {
            panic!("a listed channel stays listed");
        };
        let flips: f64 = rest.iter().map(|(_, p)| p).sum();
        assert!((flips - 2.0 * p / 3.0).abs() < 1e-15);
        assert!(rest.iter().all(|(word, _)| word.x == 1));
        assert!((rest[0].1 - rest[1].1).abs() < 1e-15);
    }

    #[test]
    fn a_dephasing_goes_in_whole() {
        let (common, rest) = split(&channel(&[(Z, 0.03)]), &z_axis()).unwrap();
        assert!((common - 0.03).abs() < 1e-15);
        assert_eq!(rest, None);
    }

    #[test]
    fn a_certain_flip_about_the_axis_has_no_common_part() {
        assert!(split(&channel(&[(Z, 1.0)]), &z_axis()).is_none());
        assert!(split(&channel(&[(X, 0.2), (Z, 0.8)]), &z_axis()).is_none());
    }

    #[test]
    fn a_mostly_flipping_dephasing_leaves_its_flip() {
        let (common, rest) = split(&channel(&[(Z, 0.9)]), &z_axis()).unwrap();
        assert!((common - 0.1).abs() < 1e-15);
        assert_eq!(rest, Some(channel(&[(Z, 1.0)])));
    }

    #[test]
    fn a_full_dephasing_goes_in_whole() {
        let (common, rest) = split(&channel(&[(Z, 0.5)]), &z_axis()).unwrap();
        assert_eq!((common, rest), (0.5, None));
    }

    #[test]
    fn other_axes_and_other_qubits_have_no_part() {
        assert!(split(&channel(&[(X, 0.2)]), &z_axis()).is_none());
        let elsewhere = smallvec![(8, Pauli::Z)];
        assert!(split(&channel(&[(Z, 0.2)]), &elsewhere).is_none());
    }
}
