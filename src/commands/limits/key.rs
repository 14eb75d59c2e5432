//! `limits key`: a key pair for a person who approves files.

use crate::commands::{passphrase, store};
use crate::keys::{Signer, encrypt};
use crate::site::Role;
use serde_json::json;
use std::path::{Path, PathBuf};

#[derive(Debug, clap::Args)]
pub struct Args {
    /// The code that the site uses for the person, such as QE-02
    #[arg(long, value_name = "PERSON")]
    name: String,
    /// What the key may approve
    #[arg(long, value_enum, default_value = "quality_engineer")]
    role: RoleArg,
    /// File for the private key; it must not exist yet
    #[arg(long, value_name = "FILE")]
    out: PathBuf,
    /// File whose first line is the passphrase (`-`: standard input) [default: it is asked for]
    #[arg(long, value_name = "FILE")]
    passphrase_file: Option<PathBuf>,
}

#[derive(Debug, Clone, Copy, clap::ValueEnum)]
#[value(rename_all = "snake_case")]
pub enum RoleArg {
    /// Limit, station and site files
    QualityEngineer,
    /// Station files
    Metrologist,
}

impl From<RoleArg> for Role {
    fn from(role: RoleArg) -> Role {
        match role {
            RoleArg::QualityEngineer => Role::QualityEngineer,
            RoleArg::Metrologist => Role::Metrologist,
        }
    }
}

/// Makes the pair and keeps the private half; what is to be printed.
///
/// # Errors
/// In words; there is then no file.
pub fn run(args: &Args, as_json: bool) -> Result<String, String> {
    check_name(&args.name)?;
    let shown = args.out.display();
    if args.out.symlink_metadata().is_ok() {
        return Err(format!(
            "{shown}: is there already, and a key is never overwritten: name another file"
        ));
    }
    let passphrase = passphrase::get(args.passphrase_file.as_deref(), &args.name, true)?;
    let mut random = [0; 64];
    getrandom::fill(&mut random).map_err(|e| format!("the system gives no random numbers: {e}"))?;
    let [secret, salt, iv] = split(&random);
    let signer = Signer::new(&args.name, &secret).map_err(|e| e.to_string())?;
    let salt = salt.first_chunk().ok_or("no salt")?;
    let iv = *iv.first_chunk().ok_or("no initialisation vector")?;
    let pem = encrypt(&secret, &passphrase, salt, iv).map_err(|e| e.to_string())?;
    let public = signer.verifier().text();
    keep(&args.out, &args.name, &public, &pem)?;
    let role = Role::from(args.role).name();
    let line = format!("- {{name: {}, role: {role}, key: {public}}}", args.name);
    if as_json {
        let value =
            json!({"name": args.name, "role": role, "key": public, "file": shown.to_string()});
        return Ok(format!("{value:#}\n"));
    }
    Ok(format!(
        "The private key is in {shown}, under its passphrase. Keep it where only\n{} can read it, and a copy apart; without the passphrase it is lost.\n\n\
         The site trusts it with this line under `trusted_keys:` in limits/site.yaml:\n\n  {line}\n",
        args.name
    ))
}

/// Secret, salt and vector out of 64 random bytes.
fn split(random: &[u8; 64]) -> [[u8; 32]; 3] {
    let mut out = [[0; 32]; 3];
    out[0].copy_from_slice(&random[..32]);
    out[1][..16].copy_from_slice(&random[32..48]);
    out[2][..16].copy_from_slice(&random[48..]);
    out
}

/// The rules for names in site files.
fn check_name(name: &str) -> Result<(), String> {
    match crate::diagnostic::file_name::fault_of(name) {
        None if !name.contains(['+', ' ']) => Ok(()),
        _ => Err(format!(
            "`{}` cannot name a key: take the code that the site uses for the person, of letters A-Z a-z, digits, `-`, `_` and `.`",
            crate::diagnostic::excerpt(name)
        )),
    }
}

fn keep(path: &Path, name: &str, public: &str, pem: &str) -> Result<(), String> {
    let text = format!("Private key of {name}, for approvals; its public half:\n{public}\n{pem}");
    store::write_private(path, text.as_bytes())
        .map_err(|e| format!("{}: cannot be written: {e}", path.display()))
}
