//! The XMP packet (ISO 16684-1) with the PDF/A identification (ISO 19005-1, 6.7.11).

use super::finish::{Conformance, Description};

/// The packet; its dates and texts equal those of the document information dictionary.
pub(super) fn packet(description: &Description, conformance: Conformance) -> String {
    let part = conformance.part();
    let dates = description
        .date
        .map(|d| {
            let d = d.to_rfc3339_opts(chrono::SecondsFormat::Secs, false);
            format!(
                "   <xmp:CreateDate>{d}</xmp:CreateDate>\n   <xmp:ModifyDate>{d}</xmp:ModifyDate>\n"
            )
        })
        .unwrap_or_default();
    format!(
        r#"<?xpacket begin="{bom}" id="W5M0MpCehiHzreSzNTczkc9d"?>
<x:xmpmeta xmlns:x="adobe:ns:meta/">
 <rdf:RDF xmlns:rdf="http://www.w3.org/1999/02/22-rdf-syntax-ns#">
  <rdf:Description rdf:about="" xmlns:dc="http://purl.org/dc/elements/1.1/" xmlns:pdf="http://ns.adobe.com/pdf/1.3/" xmlns:pdfaid="http://www.aiim.org/pdfa/ns/id/" xmlns:xmp="http://ns.adobe.com/xap/1.0/">
   <pdfaid:part>{part}</pdfaid:part>
   <pdfaid:conformance>B</pdfaid:conformance>
   <dc:format>application/pdf</dc:format>
   <dc:language><rdf:Bag><rdf:li>en</rdf:li></rdf:Bag></dc:language>
   <dc:title><rdf:Alt><rdf:li xml:lang="x-default">{title}</rdf:li></rdf:Alt></dc:title>
   <dc:description><rdf:Alt><rdf:li xml:lang="x-default">{subject}</rdf:li></rdf:Alt></dc:description>
   <dc:creator><rdf:Seq><rdf:li>{author}</rdf:li></rdf:Seq></dc:creator>
   <xmp:CreatorTool>{producer}</xmp:CreatorTool>
   <pdf:Producer>{producer}</pdf:Producer>
{dates}  </rdf:Description>
 </rdf:RDF>
</x:xmpmeta>
<?xpacket end="w"?>
"#,
        bom = '\u{feff}',
        title = escape(&description.title),
        subject = escape(&description.subject),
        author = escape(&description.author),
        producer = escape(&description.producer),
    )
}

/// Text as XML character data.
fn escape(text: &str) -> String {
    text.replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
}

/// Only characters that XML 1.0 (production 2) can hold; others become U+FFFD.
pub(super) fn printable(text: &str) -> String {
    text.chars()
        .map(|c| match c {
            '\u{20}'..='\u{d7ff}' | '\u{e000}'..='\u{fffd}' | '\u{10000}'..='\u{10ffff}' => c,
            _ => '\u{fffd}',
        })
        .collect()
}
