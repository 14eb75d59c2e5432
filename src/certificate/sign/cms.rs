//! The signature itself: CMS SignedData (RFC 5652) with the signed attributes of a CAdES baseline
//! signature (ETSI EN 319 122-1, 5): content type, message digest, signing certificate. The time stands in
//! the PDF and not here, as ETSI EN 319 142-1 demands.

use super::identity::{Signatory, Signer};
use cms::cert::{CertificateChoices, IssuerAndSerialNumber};
use cms::content_info::{CmsVersion, ContentInfo};
use cms::signed_data::{
    CertificateSet, EncapsulatedContentInfo, SignedData, SignerIdentifier, SignerInfo, SignerInfos,
};
use der::asn1::{ObjectIdentifier, OctetString, SetOfVec};
use der::{Any, Decode, Encode, Sequence};
use p256::ecdsa::signature::{Signer as _, Verifier as _};
use p256::ecdsa::{DerSignature, Signature, VerifyingKey};
use p256::pkcs8::DecodePublicKey;
use sha2::{Digest, Sha256};
use x509_cert::Certificate;
use x509_cert::attr::Attribute;
use x509_cert::spki::AlgorithmIdentifierOwned;

const DATA: ObjectIdentifier = ObjectIdentifier::new_unwrap("1.2.840.113549.1.7.1");
const SIGNED_DATA: ObjectIdentifier = ObjectIdentifier::new_unwrap("1.2.840.113549.1.7.2");
const CONTENT_TYPE: ObjectIdentifier = ObjectIdentifier::new_unwrap("1.2.840.113549.1.9.3");
const MESSAGE_DIGEST: ObjectIdentifier = ObjectIdentifier::new_unwrap("1.2.840.113549.1.9.4");
/// RFC 5035.
const SIGNING_CERTIFICATE_V2: ObjectIdentifier =
    ObjectIdentifier::new_unwrap("1.2.840.113549.1.9.16.2.47");
const SHA256: ObjectIdentifier = ObjectIdentifier::new_unwrap("2.16.840.1.101.3.4.2.1");
/// RFC 5758.
const ECDSA_WITH_SHA256: ObjectIdentifier = ObjectIdentifier::new_unwrap("1.2.840.10045.4.3.2");

/// ESSCertIDv2 (RFC 5035) with its default hash, SHA-256, which DER leaves out.
#[derive(Sequence)]
struct CertificateId {
    hash: OctetString,
}

#[derive(Sequence)]
struct SigningCertificate {
    certificates: Vec<CertificateId>,
}

/// The signature over a document of that SHA-256 digest, in DER.
pub(super) fn signed(signer: &Signer, digest: &[u8; 32]) -> Result<Vec<u8>, der::Error> {
    let own = signer.certificate();
    let attributes = attributes(own, digest)?;
    let signature: DerSignature = signer.key().sign(&attributes.to_der()?);
    let info = SignerInfo {
        version: CmsVersion::V1,
        sid: SignerIdentifier::IssuerAndSerialNumber(IssuerAndSerialNumber {
            issuer: own.tbs_certificate().issuer().clone(),
            serial_number: own.tbs_certificate().serial_number().clone(),
        }),
        digest_alg: algorithm(SHA256),
        signed_attrs: Some(attributes),
        signature_algorithm: algorithm(ECDSA_WITH_SHA256),
        signature: OctetString::new(signature.as_bytes())?,
        unsigned_attrs: None,
    };
    let certificates: Vec<CertificateChoices> = signer
        .chain()
        .iter()
        .map(|c| CertificateChoices::Certificate(c.clone()))
        .collect();
    let data = SignedData {
        version: CmsVersion::V1,
        digest_algorithms: SetOfVec::try_from(vec![algorithm(SHA256)])?,
        encap_content_info: EncapsulatedContentInfo {
            econtent_type: DATA,
            econtent: None,
        },
        certificates: Some(CertificateSet::try_from(certificates)?),
        crls: None,
        signer_infos: SignerInfos::try_from(vec![info])?,
    };
    let content = ContentInfo {
        content_type: SIGNED_DATA,
        content: Any::encode_from(&data)?,
    };
    content.to_der()
}

fn algorithm(oid: ObjectIdentifier) -> AlgorithmIdentifierOwned {
    AlgorithmIdentifierOwned {
        oid,
        parameters: None,
    }
}

fn attributes(own: &Certificate, digest: &[u8; 32]) -> Result<SetOfVec<Attribute>, der::Error> {
    let one = |oid, value: Any| {
        Ok::<_, der::Error>(Attribute {
            oid,
            values: SetOfVec::try_from(vec![value])?,
        })
    };
    let certificate = SigningCertificate {
        certificates: vec![CertificateId {
            hash: OctetString::new(Sha256::digest(own.to_der()?).to_vec())?,
        }],
    };
    SetOfVec::try_from(vec![
        one(CONTENT_TYPE, Any::encode_from(&DATA)?)?,
        one(
            MESSAGE_DIGEST,
            Any::encode_from(&OctetString::new(digest.to_vec())?)?,
        )?,
        one(SIGNING_CERTIFICATE_V2, Any::encode_from(&certificate)?)?,
    ])
}

/// Whether the signature, with zeros behind it, is one over a document of that digest; whose it is.
///
/// # Errors
/// In words: what does not hold.
pub(super) fn check(contents: &[u8], digest: &[u8; 32]) -> Result<Signatory, String> {
    let unreadable = |e: der::Error| format!("its signature cannot be read ({e})");
    let (content, _) = ContentInfo::from_der_partial(contents).map_err(unreadable)?;
    let data: SignedData = content.content.decode_as().map_err(unreadable)?;
    let info = match data.signer_infos.0.as_slice() {
        [one] => one,
        _ => return Err("it has not one signer".to_owned()),
    };
    let own = data
        .certificates
        .iter()
        .flat_map(|set| set.0.iter())
        .find_map(|choice| match choice {
            CertificateChoices::Certificate(c) if is_of(info, c) => Some(c),
            _ => None,
        })
        .ok_or("its signature lacks the signer's certificate")?;
    let expected = attributes(own, digest).map_err(unreadable)?;
    if info.signed_attrs.as_ref() != Some(&expected) {
        return Err(
            "its signature is of another document: it was changed after it was signed".to_owned(),
        );
    }
    let key = own
        .tbs_certificate()
        .subject_public_key_info()
        .to_der()
        .map_err(unreadable)?;
    let key = VerifyingKey::from_public_key_der(&key)
        .map_err(|_| "it was signed with a key that is not on the curve P-256".to_owned())?;
    let signature = Signature::from_der(info.signature.as_bytes())
        .map_err(|_| "its signature is no ECDSA signature".to_owned())?;
    let signed = expected.to_der().map_err(unreadable)?;
    key.verify(&signed, &signature)
        .map_err(|_| "its signature was not made with the key of its certificate".to_owned())?;
    Signatory::of(own).map_err(unreadable)
}

fn is_of(info: &SignerInfo, certificate: &Certificate) -> bool {
    let tbs = certificate.tbs_certificate();
    match &info.sid {
        SignerIdentifier::IssuerAndSerialNumber(sid) => {
            sid.issuer == *tbs.issuer() && sid.serial_number == *tbs.serial_number()
        }
        SignerIdentifier::SubjectKeyIdentifier(_) => false,
    }
}
