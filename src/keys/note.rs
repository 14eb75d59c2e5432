//! Signed notes in the text form of C2SP `signed-note` with Ed25519 (RFC 8032), and the keys that
//! sign them.
//!
//! A note is a text that ends in a newline, an empty line, and signature lines
//! `— <key name> <base64 of key ID ‖ signature>`.

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use ed25519_dalek::{Signature, Signer as _, SigningKey, VerifyingKey};
use sha2::{Digest as _, Sha256};
use std::fmt;

/// Signature type of Ed25519 in `signed-note`.
const ED25519: u8 = 1;
/// How the text of a secret key begins.
const SECRET: &str = "PRIVATE+KEY+";
const DASH: &str = "\u{2014} ";
/// More than any note of ours; a limit on what is parsed.
const MAX_NOTE: usize = 64 * 1024;

/// Why a note is not believed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NoteError(pub String);

impl fmt::Display for NoteError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}

impl std::error::Error for NoteError {}

fn wrong<T>(why: impl Into<String>) -> Result<T, NoteError> {
    Err(NoteError(why.into()))
}

/// A key that signs, with its name.
#[derive(Clone)]
pub struct Signer {
    name: String,
    key: SigningKey,
}

/// A key that is trusted, with its name.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Verifier {
    name: String,
    key: VerifyingKey,
}

impl Signer {
    /// From the 32 secret bytes of RFC 8032, which must come from a good source of randomness.
    ///
    /// # Errors
    /// A name that is empty or holds a space, a plus sign or a control character.
    pub fn new(name: &str, secret: &[u8; 32]) -> Result<Self, NoteError> {
        check_name(name)?;
        Ok(Signer {
            name: name.to_owned(),
            key: SigningKey::from_bytes(secret),
        })
    }

    /// From the text that [`Signer::secret_text`] makes.
    ///
    /// # Errors
    /// A text that is no such key, or whose key ID is not that of its key.
    pub fn read(text: &str) -> Result<Self, NoteError> {
        let bad = || NoteError("the secret key is not in its text form".to_owned());
        let rest = text.trim().strip_prefix(SECRET).ok_or_else(bad)?;
        let mut parts = rest.splitn(3, '+');
        let (Some(name), Some(id), Some(key)) = (parts.next(), parts.next(), parts.next()) else {
            return Err(bad());
        };
        let bytes = STANDARD.decode(key).map_err(|_| bad())?;
        let secret: &[u8; 32] = match bytes.split_first() {
            Some((&ED25519, secret)) => secret.try_into().map_err(|_| bad())?,
            _ => return Err(bad()),
        };
        let signer = Signer::new(name, secret)?;
        if hex(&signer.verifier().id()) != id {
            return wrong("the key ID is not that of the secret key");
        }
        Ok(signer)
    }

    /// The secret key as a text, for the file that holds it.
    pub fn secret_text(&self) -> String {
        let bytes = [&[ED25519][..], self.key.as_bytes()].concat();
        let id = hex(&self.verifier().id());
        format!("{SECRET}{}+{id}+{}", self.name, STANDARD.encode(bytes))
    }

    /// The public half.
    pub fn verifier(&self) -> Verifier {
        Verifier {
            name: self.name.clone(),
            key: self.key.verifying_key(),
        }
    }

    /// Signs a text; the note.
    ///
    /// # Errors
    /// A text that does not end in a newline or holds another control character.
    pub fn sign(&self, text: &str) -> Result<String, NoteError> {
        check_text(text)?;
        let mut bytes = self.verifier().id().to_vec();
        bytes.extend_from_slice(&self.key.sign(text.as_bytes()).to_bytes());
        Ok(format!(
            "{text}\n{DASH}{} {}\n",
            self.name,
            STANDARD.encode(bytes)
        ))
    }
}

/// Says nothing of the secret.
impl fmt::Debug for Signer {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Signer")
            .field("name", &self.name)
            .finish_non_exhaustive()
    }
}

impl Verifier {
    /// From a public key of 32 bytes.
    ///
    /// # Errors
    /// A name that cannot be one, or bytes that are no point of the curve.
    pub fn new(name: &str, public: &[u8]) -> Result<Self, NoteError> {
        check_name(name)?;
        let public: &[u8; 32] = public
            .try_into()
            .map_err(|_| NoteError("an Ed25519 public key has 32 bytes".to_owned()))?;
        let key = VerifyingKey::from_bytes(public)
            .map_err(|_| NoteError("not an Ed25519 public key".to_owned()))?;
        if key.is_weak() {
            return wrong("a weak Ed25519 public key, under which anything verifies");
        }
        Ok(Verifier {
            name: name.to_owned(),
            key,
        })
    }

    /// From the text that [`Verifier::text`] makes.
    ///
    /// # Errors
    /// A text that is no such key, or whose key ID is not that of its key.
    pub fn read(text: &str) -> Result<Self, NoteError> {
        let mut parts = text.trim().splitn(3, '+');
        let (Some(name), Some(id), Some(key)) = (parts.next(), parts.next(), parts.next()) else {
            return wrong("a public key is written name+id+base64");
        };
        let bytes = STANDARD
            .decode(key)
            .map_err(|_| NoteError("the public key is not base64".to_owned()))?;
        let Some((&ED25519, public)) = bytes.split_first() else {
            return wrong("the public key is not of the kind Ed25519");
        };
        let verifier = Verifier::new(name, public)?;
        if hex(&verifier.id()) != id {
            return wrong("the key ID is not that of the key");
        }
        Ok(verifier)
    }

    /// `name+id+base64`, the usual text of such a key.
    pub fn text(&self) -> String {
        let bytes = [&[ED25519][..], self.key.as_bytes()].concat();
        format!(
            "{}+{}+{}",
            self.name,
            hex(&self.id()),
            STANDARD.encode(bytes)
        )
    }

    #[allow(missing_docs)]
    pub fn name(&self) -> &str {
        &self.name
    }

    /// The 32 bytes of the public key.
    pub fn public(&self) -> [u8; 32] {
        self.key.to_bytes()
    }

    /// The key ID: the first four bytes of SHA-256(name ‖ newline ‖ type ‖ key).
    fn id(&self) -> [u8; 4] {
        let name = self.name.as_bytes();
        let bytes = [name, &[b'\n', ED25519], self.key.as_bytes()].concat();
        let [a, b, c, d, ..]: [u8; 32] = Sha256::digest(&bytes).into();
        [a, b, c, d]
    }

    /// The text of a note that this key has signed.
    ///
    /// # Errors
    /// A malformed note, no signature by this key, or one that does not verify. Signatures by other
    /// keys are passed over.
    pub fn open<'a>(&self, note: &'a str) -> Result<&'a str, NoteError> {
        let (text, signatures) = parts(note)?;
        let mut good = false;
        for (name, bytes) in signatures {
            let Some((id, signature)) = bytes.split_first_chunk::<4>() else {
                return wrong("a signature line is too short");
            };
            if name != self.name || *id != self.id() {
                continue;
            }
            let signature = Signature::from_slice(signature)
                .map_err(|_| NoteError("the signature has not 64 bytes".to_owned()))?;
            if self.key.verify_strict(text.as_bytes(), &signature).is_err() {
                return wrong(format!("the signature of {name} is not one of this text"));
            }
            good = true;
        }
        if good {
            Ok(text)
        } else {
            wrong(format!("no signature of {} on it", self.name))
        }
    }
}

/// Name and bytes of each signature line.
type Signatures<'a> = Vec<(&'a str, Vec<u8>)>;

/// Text and signatures of a note; the text ends in its newline.
fn parts(note: &str) -> Result<(&str, Signatures<'_>), NoteError> {
    if note.len() > MAX_NOTE {
        return wrong("too long for a signed note");
    }
    let Some(end) = note.rfind("\n\n") else {
        return wrong("no empty line between text and signatures");
    };
    let (text, lines) = (note.get(..=end), note.get(end + 2..));
    let (Some(text), Some(lines)) = (text, lines.and_then(|l| l.strip_suffix('\n'))) else {
        return wrong("the last line does not end");
    };
    check_text(text)?;
    let signatures: Result<Signatures, NoteError> = lines.split('\n').map(signature).collect();
    signatures.map(|signatures| (text, signatures))
}

fn signature(line: &str) -> Result<(&str, Vec<u8>), NoteError> {
    let parsed = line
        .strip_prefix(DASH)
        .and_then(|rest| rest.split_once(' '));
    let Some((name, base64)) = parsed else {
        return wrong("a signature line is not `— name base64`");
    };
    check_name(name)?;
    let bytes = STANDARD
        .decode(base64)
        .map_err(|_| NoteError("a signature is not base64".to_owned()))?;
    Ok((name, bytes))
}

fn check_name(name: &str) -> Result<(), NoteError> {
    let bad = |c: char| c.is_whitespace() || c.is_control() || c == '+';
    if name.is_empty() || name.contains(bad) {
        return wrong(format!(
            "{name:?} cannot name a key: no spaces, no plus signs"
        ));
    }
    Ok(())
}

fn check_text(text: &str) -> Result<(), NoteError> {
    if !text.ends_with('\n') {
        return wrong("the text does not end in a newline");
    }
    if text.contains(|c: char| c.is_ascii_control() && c != '\n') {
        return wrong("the text holds a control character");
    }
    Ok(())
}

/// Lower-case hexadecimal.
fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}
