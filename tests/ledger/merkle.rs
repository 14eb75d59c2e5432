//! The Merkle tree against the reference vectors of the RFC and against another implementation.

use ct_merkle::mem_backed_tree::MemoryBackedTree;
use ct_merkle::{ConsistencyProof, InclusionProof};
use proptest::prelude::*;
use reelgate::ledger::Hash;
use reelgate::ledger::merkle::*;
use sha2::Sha256;

/// The eight entries of the reference vectors that implementations of RFC 6962 and RFC 9162 share.
const ENTRIES: [&str; 8] = [
    "",
    "00",
    "10",
    "2021",
    "3031",
    "40414243",
    "5051525354555657",
    "606162636465666768696a6b6c6d6e6f",
];

/// Their tree hashes for 1 to 8 entries.
const ROOTS: [&str; 8] = [
    "6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d",
    "fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125",
    "aeb6bcfe274b70a14fb067a5e5578264db0fa9b51af5e0ba159158f329e06e77",
    "d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7",
    "4e3bbb1f7b478dcfe71fb631631519a3bca12c9aefca1612bfce4c13a86264d4",
    "76e67dadbcdf1e10e1b74ddc608abd2f98dfb16fbce75277b5232a127f2087ef",
    "ddb89be403809e325750d3d263cd78929c2942b7942a34b77e122c9594a74c8c",
    "5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328",
];

/// Inclusion proofs: index, size, proof.
const INCLUSION: [(usize, usize, &[&str]); 5] = [
    (0, 1, &[]),
    (
        0,
        8,
        &[
            "96a296d224f285c67bee93c30f8a309157f0daa35dc5b87e410b78630a09cfc7",
            "5f083f0a1a33ca076a95279832580db3e0ef4584bdff1f54c8a360f50de3031e",
            "6b47aaf29ee3c2af9af889bc1fb9254dabd31177f16232dd6aab035ca39bf6e4",
        ],
    ),
    (
        5,
        8,
        &[
            "bc1a0643b12e4d2d7c77918f44e0f4f79a838b6cf9ec5b5c283e1f4d88599e6b",
            "ca854ea128ed050b41b35ffc1b87b8eb2bde461e9e3b5596ece6b9d5975a0ae0",
            "d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7",
        ],
    ),
    (
        2,
        3,
        &["fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125"],
    ),
    (
        1,
        5,
        &[
            "6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d",
            "5f083f0a1a33ca076a95279832580db3e0ef4584bdff1f54c8a360f50de3031e",
            "bc1a0643b12e4d2d7c77918f44e0f4f79a838b6cf9ec5b5c283e1f4d88599e6b",
        ],
    ),
];

/// Consistency proofs: old size, new size, proof.
const CONSISTENCY: [(usize, usize, &[&str]); 5] = [
    (1, 1, &[]),
    (
        1,
        8,
        &[
            "96a296d224f285c67bee93c30f8a309157f0daa35dc5b87e410b78630a09cfc7",
            "5f083f0a1a33ca076a95279832580db3e0ef4584bdff1f54c8a360f50de3031e",
            "6b47aaf29ee3c2af9af889bc1fb9254dabd31177f16232dd6aab035ca39bf6e4",
        ],
    ),
    (
        6,
        8,
        &[
            "0ebc5d3437fbe2db158b9f126a1d118e308181031d0a949f8dededebc558ef6a",
            "ca854ea128ed050b41b35ffc1b87b8eb2bde461e9e3b5596ece6b9d5975a0ae0",
            "d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7",
        ],
    ),
    (
        2,
        5,
        &[
            "5f083f0a1a33ca076a95279832580db3e0ef4584bdff1f54c8a360f50de3031e",
            "bc1a0643b12e4d2d7c77918f44e0f4f79a838b6cf9ec5b5c283e1f4d88599e6b",
        ],
    ),
    (
        6,
        7,
        &[
            "0ebc5d3437fbe2db158b9f126a1d118e308181031d0a949f8dededebc558ef6a",
            "b08693ec2e721597130641e8211e7eedccb4c26413963eee6c1e2ed16ffb1a5f",
            "d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7",
        ],
    ),
];

fn bytes(hex: &str) -> Vec<u8> {
    (0..hex.len() / 2)
        .map(|k| u8::from_str_radix(&hex[2 * k..2 * k + 2], 16).expect("hex"))
        .collect()
}

fn hash(hex: &str) -> Hash {
    bytes(hex).try_into().expect("32 bytes")
}

fn leaves() -> Vec<Hash> {
    ENTRIES
        .iter()
        .map(|entry| leaf_hash(&bytes(entry)))
        .collect()
}

#[test]
fn reference_roots() {
    let leaves = leaves();
    // RFC 9162 section 2.1.1: the hash of an empty tree is that of an empty string.
    let empty = hash("e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    assert_eq!((root(&[]), Frontier::default().root()), (empty, empty));
    let mut frontier = Frontier::default();
    for (k, wanted) in ROOTS.iter().enumerate() {
        frontier.push(leaves[k]);
        assert_eq!(root(&leaves[..=k]), hash(wanted));
        assert_eq!(frontier.root(), hash(wanted));
    }
}

#[test]
fn reference_proofs() {
    let leaves = leaves();
    for (index, size, proof) in INCLUSION {
        let proof: Vec<Hash> = proof.iter().map(|h| hash(h)).collect();
        assert_eq!(inclusion_proof(&leaves[..size], index), Some(proof.clone()));
        let root = hash(ROOTS[size - 1]);
        assert!(verify_inclusion(
            &leaves[index],
            index as u64,
            size as u64,
            &proof,
            &root
        ));
    }
    for (old, new, proof) in CONSISTENCY {
        let proof: Vec<Hash> = proof.iter().map(|h| hash(h)).collect();
        assert_eq!(consistency_proof(&leaves[..new], old), Some(proof.clone()));
        let (a, b) = (hash(ROOTS[old - 1]), hash(ROOTS[new - 1]));
        assert!(verify_consistency(
            (old as u64, &a),
            (new as u64, &b),
            &proof
        ));
    }
}

#[test]
fn no_proof_where_there_is_nothing_to_prove() {
    let leaves = leaves();
    assert_eq!(inclusion_proof(&[], 0), None);
    assert_eq!(inclusion_proof(&leaves, 8), None);
    assert_eq!(consistency_proof(&leaves, 0), None);
    assert_eq!(consistency_proof(&leaves, 9), None);
    let any = hash(ROOTS[3]);
    for (index, size) in [(0, 0), (1, 0), (2, 1), (u64::MAX, u64::MAX), (0, u64::MAX)] {
        assert!(!verify_inclusion(&any, index, size, &[], &any));
    }
    for (old, new) in [
        (0, 0),
        (0, 1),
        (2, 1),
        (1, 2),
        (u64::MAX - 1, u64::MAX),
        (1, u64::MAX),
    ] {
        assert!(!verify_consistency((old, &any), (new, &any), &[]));
        assert!(!verify_consistency((old, &any), (new, &any), &[any]));
    }
}

/// Every size to 40 against an implementation that is not ours (crate `ct-merkle`).
#[test]
fn another_implementation_agrees() {
    let entries: Vec<Vec<u8>> = (0..40_u8).map(|k| vec![k; usize::from(k)]).collect();
    let leaves: Vec<Hash> = entries.iter().map(|entry| leaf_hash(entry)).collect();
    let mut tree = MemoryBackedTree::<Sha256, Vec<u8>>::new();
    let mut heads = Vec::new();
    for (k, entry) in entries.iter().enumerate() {
        tree.push(entry.clone());
        let size = k + 1;
        let head = tree.root();
        assert_eq!(head.as_bytes().as_slice(), root(&leaves[..size]).as_slice());
        heads.push(head.clone());
        for (index, entry) in entries.iter().enumerate().take(size) {
            let ours = inclusion_proof(&leaves[..size], index)
                .expect("a proof")
                .concat();
            assert_eq!(tree.prove_inclusion(index).as_bytes(), ours);
            let proof = InclusionProof::try_from_bytes(ours).expect("a proof");
            head.verify_inclusion(entry, index as u64, &proof)
                .expect("included");
        }
        for old in 1..size {
            let ours = consistency_proof(&leaves[..size], old)
                .expect("a proof")
                .concat();
            assert_eq!(tree.prove_consistency(size - old).as_bytes(), ours);
            let proof = ConsistencyProof::try_from_bytes(ours).expect("a proof");
            head.verify_consistency(&heads[old - 1], &proof)
                .expect("consistent");
        }
    }
}

fn tree() -> impl Strategy<Value = (Vec<Hash>, usize, usize)> {
    (1..200_usize)
        .prop_flat_map(|size| (Just(size), 0..size))
        .prop_map(|(size, index)| {
            let leaves = (0..size).map(|k| leaf_hash(&k.to_be_bytes())).collect();
            (leaves, index, size)
        })
}

proptest! {
    #[test]
    fn the_frontier_is_the_tree((leaves, _, size) in tree()) {
        let mut frontier = Frontier::default();
        for (k, leaf) in leaves.iter().enumerate() {
            let proof = frontier.push(*leaf);
            prop_assert_eq!(Some(proof), inclusion_proof(&leaves[..=k], k));
        }
        prop_assert_eq!(frontier.root(), root(&leaves));
        prop_assert_eq!(Frontier::new(size as u64, &frontier.bytes()), Some(frontier.clone()));
        prop_assert_eq!(Frontier::new(size as u64 ^ 1, &frontier.bytes()), None);
    }

    /// Wrong index, size, root, leaf; a proof changed in one bit, lengthened, shortened.
    #[test]
    fn wrong_inclusion_proofs_fail((leaves, index, size) in tree(), pick in any::<prop::sample::Index>(), bit in 0..256_usize) {
        let (head, leaf) = (root(&leaves), leaves[index]);
        let proof = inclusion_proof(&leaves, index).expect("a proof");
        let (index, size) = (index as u64, size as u64);
        let other = leaf_hash(b"other");
        prop_assert!(verify_inclusion(&leaf, index, size, &proof, &head));
        prop_assert!(!verify_inclusion(&leaf, index, size, &proof, &other));
        prop_assert!(!verify_inclusion(&other, index, size, &proof, &head));
        for wrong in [index.wrapping_sub(1), index + 1, index ^ 2] {
            prop_assert!(!verify_inclusion(&leaf, wrong, size, &proof, &head));
        }
        prop_assert!(!verify_inclusion(&leaf, index, size * 2, &proof, &head));
        for wrong in [[proof.clone(), vec![head]].concat(), [vec![head], proof.clone()].concat()] {
            prop_assert!(!verify_inclusion(&leaf, index, size, &wrong, &head));
        }
        if !proof.is_empty() {
            prop_assert!(!verify_inclusion(&leaf, index, size, &proof[1..], &head));
            prop_assert!(!verify_inclusion(&leaf, index, size, &proof[..proof.len() - 1], &head));
            let mut wrong = proof.clone();
            wrong[pick.index(proof.len())][bit / 8] ^= 1 << (bit % 8);
            prop_assert!(!verify_inclusion(&leaf, index, size, &wrong, &head));
        }
    }

    #[test]
    fn wrong_consistency_proofs_fail((leaves, old, size) in tree(), pick in any::<prop::sample::Index>(), bit in 0..256_usize) {
        let old = old.max(1);
        let (a, b) = (root(&leaves[..old]), root(&leaves));
        let proof = consistency_proof(&leaves, old).expect("a proof");
        let (old, new) = (old as u64, size as u64);
        prop_assert!(verify_consistency((old, &a), (new, &b), &proof));
        let other = leaf_hash(b"other");
        prop_assert!(!verify_consistency((old, &other), (new, &b), &proof));
        prop_assert!(!verify_consistency((old, &a), (new, &other), &proof));
        for wrong in [[proof.clone(), vec![b]].concat(), [vec![a], proof.clone()].concat()] {
            prop_assert!(!verify_consistency((old, &a), (new, &b), &wrong));
        }
        if !proof.is_empty() {
            prop_assert!(!verify_consistency((old, &b), (new, &a), &proof));
            prop_assert!(!verify_consistency((old, &a), (new, &b), &[]));
            prop_assert!(!verify_consistency((old, &a), (new, &b), &proof[..proof.len() - 1]));
            prop_assert!(!verify_consistency((old, &a), (new * 2, &b), &proof));
            let mut wrong = proof.clone();
            wrong[pick.index(proof.len())][bit / 8] ^= 1 << (bit % 8);
            prop_assert!(!verify_consistency((old, &a), (new, &b), &wrong));
        }
    }
}
