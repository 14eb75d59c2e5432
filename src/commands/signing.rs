//! Certificate and key that documents are signed with, from the files that the site names.

use super::site::Site;
use crate::certificate::Signer;
use crate::sweep::RawFile;
use chrono::{DateTime, FixedOffset};
use std::fs;
use std::path::{Path, PathBuf};

/// Where certificate and key are.
#[derive(Debug, Clone, Default, clap::Args)]
pub struct SigningArgs {
    /// Certificate to sign the PDF with, PEM, its chain behind it [default: the site file's]
    #[arg(
        long,
        env = "REELGATE_SIGN_CERTIFICATE",
        value_name = "FILE",
        requires = "sign_key"
    )]
    sign_certificate: Option<PathBuf>,
    /// Private key of that certificate, PKCS #8 PEM, ECDSA P-256 [default: the site file's]
    #[arg(
        long,
        env = "REELGATE_SIGN_KEY",
        value_name = "FILE",
        requires = "sign_certificate"
    )]
    sign_key: Option<PathBuf>,
    /// File whose first line is the passphrase of an encrypted key
    #[arg(long, env = "REELGATE_SIGN_PASSPHRASE", value_name = "FILE")]
    sign_passphrase: Option<PathBuf>,
}

impl SigningArgs {
    /// Who signs, if anyone, valid at the time of issue: by what was asked for, else by the site file.
    ///
    /// # Errors
    /// In words, with the file: one that cannot be read, is no such file, does not belong to the
    /// other, or a certificate that is not valid.
    pub fn signer(
        &self,
        site: &Site,
        rules: Option<&RawFile>,
        time: DateTime<FixedOffset>,
    ) -> Result<Option<Signer>, String> {
        let asked = self.sign_certificate.clone().zip(self.sign_key.clone());
        let Some((certificate, key)) = asked.or_else(|| site.signing(rules)) else {
            return Ok(None);
        };
        signer(&certificate, &key, self.sign_passphrase.as_deref(), time).map(Some)
    }
}

/// Reads certificate and key, and checks that they can sign at that time.
///
/// # Errors
/// As [`SigningArgs::signer`].
pub fn signer(
    certificate: &Path,
    key: &Path,
    passphrase: Option<&Path>,
    time: DateTime<FixedOffset>,
) -> Result<Signer, String> {
    let named = |path: &Path, why: String| format!("{}: {why}", path.display());
    let read = |path: &Path| {
        fs::read(path)
            .map_err(|e| named(path, format!("cannot be read, so nothing is signed: {e}")))
    };
    let words = match passphrase {
        None => None,
        Some(path) => {
            let bytes = read(path)?;
            let line = bytes.split(|b| *b == b'\n' || *b == b'\r').next();
            Some(line.unwrap_or_default().to_vec())
        }
    };
    let (certificate_bytes, key_bytes) = (read(certificate)?, read(key)?);
    let of = |e: crate::certificate::SignerError| {
        let path = match e {
            crate::certificate::SignerError::Certificate(_) => certificate,
            crate::certificate::SignerError::Key(_) => key,
        };
        named(path, e.to_string())
    };
    let signer = Signer::read(&certificate_bytes, &key_bytes, words.as_deref()).map_err(of)?;
    signer.valid_at(time).map_err(of)?;
    Ok(signer)
}
