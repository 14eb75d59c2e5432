#!/usr/bin/env bash
# Makes the pictures of docs/certificate.md anew: from a sample lot, and from invented records of the
# tests what no sample lot has. Needs poppler-utils.
# usage: docs/certificate/make.sh [path of a built reelgate]
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/../.."
lot=26K-0466
reelgate=("${1:-}")
[ -n "${reelgate[0]}" ] || reelgate=(cargo run --quiet --release --)

site=$(mktemp -d)
trap 'rm -rf "$site"' EXIT
cp -r limits "$site/limits"
export REELGATE_NOW=2026-10-07T10:05:00+02:00
status=0
"${reelgate[@]}" --site "$site" judge "sample-lots/$lot" >/dev/null || status=$?
# 0 accepted, 1 rejected, 3 held: judged all the same.
case $status in 0 | 1 | 3) ;; *) echo "judge ended with $status" >&2; exit 1 ;; esac
pdf=$(echo "$site"/records/certificates/"$lot"-*.pdf)

pages=$(pdfinfo "$pdf" | awk '/^Pages:/ {print $2}')
page_of() {
  local n
  for n in $(seq "$pages"); do
    if pdftotext -f "$n" -l "$n" "$pdf" - | grep -qx "$1"; then echo "$n"; return; fi
  done
  echo "no page with the heading $1" >&2
  return 1
}
picture() { pdftoppm -r 64 -png -singlefile -f "$2" -l "$2" "$pdf" "docs/certificate/$1"; }

picture answer 1
picture reasons "$(page_of Reasons)"
picture curves "$(page_of Curves)"
picture distributions "$(page_of Distributions)"
picture parts "$(page_of Parts)"
picture integrity "$(page_of Integrity)"

# Another lot has capacitance and self-resonance, and the run charts and the plan on one page each.
lot=26K-0457
"${reelgate[@]}" --site "$site" judge "sample-lots/$lot" >/dev/null
pdf=$(echo "$site"/records/certificates/"$lot"-*.pdf)
pages=$(pdfinfo "$pdf" | awk '/^Pages:/ {print $2}')
picture scatter "$(page_of 'Capacitance against self-resonance')"
picture order "$(page_of 'In measuring order')"
picture plan "$(page_of 'Severity of inspection')"

REELGATE_UPDATE=1 cargo test --quiet --locked --test certificate pictures
