//! The Merkle tree of RFC 9162 section 2.1 over SHA-256.
//!
//! Leaf hash = SHA-256(0x00 ‖ entry), node hash = SHA-256(0x01 ‖ left ‖ right). The ledger appends
//! with the peaks of the tree alone (the roots of its complete subtrees, largest first), so an
//! append costs as many hashes as the size has binary digits.

use super::digest::{Hash, sha256};
use sha2::{Digest as _, Sha256};

/// Hash of a leaf.
pub fn leaf_hash(entry: &[u8]) -> Hash {
    Sha256::new()
        .chain_update([0])
        .chain_update(entry)
        .finalize()
        .into()
}

/// Hash of an inner node.
pub fn node_hash(left: &Hash, right: &Hash) -> Hash {
    Sha256::new()
        .chain_update([1])
        .chain_update(left)
        .chain_update(right)
        .finalize()
        .into()
}

/// Merkle tree hash of leaf hashes (section 2.1.1).
pub fn root(leaves: &[Hash]) -> Hash {
    match leaves {
        [] => sha256(&[]),
        [one] => *one,
        _ => {
            let (left, right) = leaves.split_at(split(leaves.len()));
            node_hash(&root(left), &root(right))
        }
    }
}

/// The largest power of two smaller than `n`, for `n` above 1.
fn split(n: usize) -> usize {
    n.next_power_of_two() / 2
}

/// The peaks of a tree: what is needed to append to it.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Frontier {
    size: u64,
    peaks: Vec<Hash>,
}

impl Frontier {
    /// From a size and the peaks one after the other; `None` where they do not fit each other.
    pub fn new(size: u64, peaks: &[u8]) -> Option<Self> {
        let (hashes, rest) = peaks.as_chunks::<32>();
        let fits = rest.is_empty() && hashes.len() == size.count_ones() as usize;
        fits.then(|| Frontier {
            size,
            peaks: hashes.to_vec(),
        })
    }

    /// Number of leaves.
    pub fn size(&self) -> u64 {
        self.size
    }

    /// The peaks one after the other, largest subtree first.
    pub fn bytes(&self) -> Vec<u8> {
        self.peaks.concat()
    }

    /// Appends a leaf; its inclusion proof in the tree that then is.
    pub fn push(&mut self, leaf: Hash) -> Vec<Hash> {
        // To the left of the last leaf stand the peaks of the tree before it, the smallest next to it.
        let proof = self.peaks.iter().rev().copied().collect();
        let mut hash = leaf;
        for _ in 0..self.size.trailing_ones() {
            if let Some(left) = self.peaks.pop() {
                hash = node_hash(&left, &hash);
            }
        }
        self.peaks.push(hash);
        self.size += 1;
        proof
    }

    /// The Merkle tree hash.
    pub fn root(&self) -> Hash {
        let mut peaks = self.peaks.iter().rev();
        match peaks.next() {
            None => sha256(&[]),
            Some(last) => peaks.fold(*last, |right, left| node_hash(left, &right)),
        }
    }
}

/// Inclusion proof of a leaf (section 2.1.3.1); `None` where there is no such leaf.
pub fn inclusion_proof(leaves: &[Hash], index: usize) -> Option<Vec<Hash>> {
    if index >= leaves.len() {
        return None;
    }
    if leaves.len() == 1 {
        return Some(Vec::new());
    }
    let k = split(leaves.len());
    let (left, right) = leaves.split_at(k);
    let (inner, sibling) = if index < k {
        (inclusion_proof(left, index)?, root(right))
    } else {
        (inclusion_proof(right, index - k)?, root(left))
    };
    Some([inner, vec![sibling]].concat())
}

/// Consistency proof between the tree of the first `old` leaves and this one (section 2.1.4.1);
/// `None` where `old` is 0 or larger than the tree.
pub fn consistency_proof(leaves: &[Hash], old: usize) -> Option<Vec<Hash>> {
    if old == 0 || old > leaves.len() {
        return None;
    }
    Some(subproof(leaves, old, true))
}

fn subproof(leaves: &[Hash], old: usize, complete: bool) -> Vec<Hash> {
    if old == leaves.len() {
        return if complete {
            Vec::new()
        } else {
            vec![root(leaves)]
        };
    }
    let k = split(leaves.len());
    let (left, right) = leaves.split_at(k);
    let (inner, sibling) = if old <= k {
        (subproof(left, old, complete), root(right))
    } else {
        (subproof(right, old - k, false), root(left))
    };
    [inner, vec![sibling]].concat()
}

/// Checks an inclusion proof (section 2.1.3.2).
pub fn verify_inclusion(leaf: &Hash, index: u64, size: u64, proof: &[Hash], root: &Hash) -> bool {
    if index >= size {
        return false;
    }
    let (mut fnode, mut snode, mut hash) = (index, size - 1, *leaf);
    for step in proof {
        if snode == 0 {
            return false;
        }
        if fnode & 1 == 1 || fnode == snode {
            hash = node_hash(step, &hash);
            while fnode & 1 == 0 && fnode != 0 {
                fnode >>= 1;
                snode >>= 1;
            }
        } else {
            hash = node_hash(&hash, step);
        }
        fnode >>= 1;
        snode >>= 1;
    }
    snode == 0 && hash == *root
}

/// Checks a consistency proof (section 2.1.4.2) for `0 < old <= new`. Equal sizes need equal roots
/// and an empty proof; nothing is consistent with an empty tree here.
pub fn verify_consistency(
    (old, old_root): (u64, &Hash),
    (new, new_root): (u64, &Hash),
    proof: &[Hash],
) -> bool {
    if old == 0 || old > new {
        return false;
    }
    if old == new {
        return proof.is_empty() && old_root == new_root;
    }
    let mut steps = proof.iter();
    let first = if old.is_power_of_two() && !proof.is_empty() {
        *old_root
    } else {
        match steps.next() {
            Some(hash) => *hash,
            None => return false,
        }
    };
    let shift = (old - 1).trailing_ones();
    let (mut fnode, mut snode) = ((old - 1) >> shift, (new - 1) >> shift);
    let (mut old_hash, mut new_hash) = (first, first);
    for step in steps {
        if snode == 0 {
            return false;
        }
        if fnode & 1 == 1 || fnode == snode {
            old_hash = node_hash(step, &old_hash);
            new_hash = node_hash(step, &new_hash);
            while fnode & 1 == 0 && fnode != 0 {
                fnode >>= 1;
                snode >>= 1;
            }
        } else {
            new_hash = node_hash(&new_hash, step);
        }
        fnode >>= 1;
        snode >>= 1;
    }
    snode == 0 && old_hash == *old_root && new_hash == *new_root
}
