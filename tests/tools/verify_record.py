#!/usr/bin/env python3
"""Verifies an exported record (a BagIt package) apart from the program that made it.

    verify_record.py PACKAGE [--key name+id+base64]

With the standard library of Python 3.11 alone. Answers 0 where everything holds and 1 where something
does not. Without --key the key in the package is believed, which proves only that it is whole.

Sources: RFC 8493 (BagIt), RFC 9162 section 2.1 (Merkle tree), RFC 8032 section 5.1 (Ed25519),
C2SP signed-note, tlog-checkpoint and tlog-proof.
"""

import argparse
import base64
import hashlib
import json
import os
import re
import sys

# Ed25519, RFC 8032 section 5.1: field, curve constant, base point, order.
P = 2**255 - 19
L = 2**252 + 27742317777372353535851937790883648493
D = -121665 * pow(121666, P - 2, P) % P
SQRT_M1 = pow(2, (P - 1) // 4, P)


class Wrong(Exception):
    """Something does not hold."""


def sha256(data):
    return hashlib.sha256(data).digest()


def add(a, b):
    """Sum of two points in extended coordinates (RFC 8032 section 5.1.4)."""
    u, v = (a[1] - a[0]) * (b[1] - b[0]), (a[1] + a[0]) * (b[1] + b[0])
    w, z = 2 * a[3] * b[3] * D, 2 * a[2] * b[2]
    e, f, g, h = v - u, z - w, z + w, v + u
    return e * f % P, g * h % P, f * g % P, e * h % P


def times(k, point):
    total = (0, 1, 1, 0)
    while k:
        if k & 1:
            total = add(total, point)
        point = add(point, point)
        k >>= 1
    return total


def same(a, b):
    return (a[0] * b[2] - b[0] * a[2]) % P == 0 and (a[1] * b[2] - b[1] * a[2]) % P == 0


def decode_point(data):
    """Point from 32 bytes (RFC 8032 section 5.1.3)."""
    y = int.from_bytes(data, "little")
    sign, y = y >> 255, y & (2**255 - 1)
    if y >= P:
        raise Wrong("a public key or signature is no point of the curve")
    x2 = (y * y - 1) * pow(D * y * y + 1, P - 2, P) % P
    x = pow(x2, (P + 3) // 8, P)
    if (x * x - x2) % P:
        x = x * SQRT_M1 % P
    if (x * x - x2) % P or (x == 0 and sign):
        raise Wrong("a public key or signature is no point of the curve")
    if x & 1 != sign:
        x = P - x
    return x, y, 1, x * y % P


BASE = decode_point((4 * pow(5, P - 2, P) % P).to_bytes(32, "little"))


def signed(public, message, signature):
    """Whether it is a signature of the message (RFC 8032 section 5.1.7)."""
    if len(public) != 32 or len(signature) != 64:
        return False
    s = int.from_bytes(signature[32:], "little")
    if s >= L:
        return False
    a, r = decode_point(public), decode_point(signature[:32])
    if same(times(8, a), (0, 1, 1, 0)):
        return False
    digest = hashlib.sha512(signature[:32] + public + message).digest()
    h = int.from_bytes(digest, "little") % L
    return same(times(s, BASE), add(r, times(h, a)))


def read_key(text):
    """Name, key ID and public key of `name+id+base64`."""
    parts = text.removesuffix("\n").split("+", 2)
    if len(parts) != 3:
        raise Wrong("the public key is not name+id+base64")
    name, key_id, data = parts[0], parts[1], base64.b64decode(parts[2], validate=True)
    if data[:1] != b"\x01" or len(data) != 33:
        raise Wrong("the public key is not of the kind Ed25519")
    if sha256(name.encode() + b"\n" + data)[:4].hex() != key_id:
        raise Wrong("the key ID is not that of the key")
    return name, bytes.fromhex(key_id), data[1:]


def open_note(note, key):
    """Text of a note that the key has signed."""
    name, key_id, public = key
    text, gap, lines = note.rpartition("\n\n")
    text += "\n"
    if not gap or not lines.endswith("\n"):
        raise Wrong("the checkpoint is not a signed note")
    good = False
    for line in lines[:-1].split("\n"):
        match = re.fullmatch("\u2014 ([^ +]+) ([A-Za-z0-9+/]+=*)", line)
        if not match:
            raise Wrong("a signature line of the checkpoint is malformed")
        data = base64.b64decode(match[2], validate=True)
        if base64.b64encode(data).decode() != match[2]:
            raise Wrong("a signature is not in its plain form")
        if (match[1], data[:4]) == (name, key_id):
            if not signed(public, text.encode(), data[4:]):
                raise Wrong(f"the signature of {name} is not one of the checkpoint")
            good = True
    if not good:
        raise Wrong(f"the checkpoint is not signed by {name}")
    return text


def climb(leaf, index, size, hashes):
    """Root by RFC 9162 section 2.1.3.2."""
    fnode, snode, value = index, size - 1, leaf
    for step in hashes:
        if snode == 0:
            raise Wrong("the inclusion proof is too long")
        if fnode & 1 or fnode == snode:
            value = sha256(b"\x01" + step + value)
            while not fnode & 1 and fnode:
                fnode, snode = fnode >> 1, snode >> 1
        else:
            value = sha256(b"\x01" + value + step)
        fnode, snode = fnode >> 1, snode >> 1
    if snode:
        raise Wrong("the inclusion proof is too short")
    return value


def check_proof(entry, proof, key):
    """Checks that the entry is in the ledger; its index, the origin and size of the ledger."""
    head, gap, note = proof.partition("\n\n")
    lines = head.split("\n")
    if not gap or lines[0] != "c2sp.org/tlog-proof@v1" or not re.fullmatch(r"index (0|[1-9]\d*)", lines[1]):
        raise Wrong("the proof is not in the form tlog-proof")
    index = int(lines[1][6:])
    hashes = [base64.b64decode(line, validate=True) for line in lines[2:]]
    if [base64.b64encode(h).decode() for h in hashes] != lines[2:]:
        raise Wrong("a hash of the proof is not in its plain form")
    origin, size, root, *rest = open_note(note, key).split("\n")
    if rest != [""] or not re.fullmatch(r"[1-9]\d*", size) or index >= int(size):
        raise Wrong("the checkpoint is not one that covers the entry")
    leaf = sha256(b"\x00" + entry)
    if climb(leaf, index, int(size), hashes) != base64.b64decode(root, validate=True):
        raise Wrong("the entry is not in the ledger that was signed")
    return index, origin, int(size)


def check_bag(folder):
    """Checks completeness and digests (RFC 8493 section 3); the payload files by path."""
    found = set()
    for base, _, names in os.walk(folder):
        for name in names:
            path = os.path.join(base, name)
            if os.path.islink(path) or not os.path.isfile(path):
                raise Wrong(f"{path}: not a plain file")
            found.add(os.path.relpath(path, folder).replace(os.sep, "/"))

    def read(path):
        with open(os.path.join(folder, path), "rb") as file:
            return file.read()

    def check(manifest, expected):
        listed = {}
        for line in read(manifest).decode().splitlines():
            match = re.fullmatch(r"([0-9a-f]{64})  (\S.*)", line)
            if not match or match[2] in listed:
                raise Wrong(f"{manifest}: malformed")
            listed[match[2]] = match[1]
        if set(listed) != expected:
            odd = sorted(set(listed) ^ expected)
            raise Wrong(f"{manifest}: not the files that are there: {odd}")
        for path, digest in listed.items():
            if sha256(read(path)).hex() != digest:
                raise Wrong(f"{path}: changed since it was packed")

    payload = {path for path in found if path.startswith("data/")}
    tags = found - payload - {"tagmanifest-sha256.txt"}
    if tags != {"bagit.txt", "bag-info.txt", "manifest-sha256.txt"}:
        raise Wrong(f"not the tag files of a package: {sorted(tags)}")
    if read("bagit.txt") != b"BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n":
        raise Wrong("bagit.txt: not a declaration of BagIt 1.0")
    check("tagmanifest-sha256.txt", tags)
    check("manifest-sha256.txt", payload)
    return {path: read(path) for path in payload}


def check_entry(files, name, key):
    """Checks one entry with its proof and its objects; the entry."""
    data = files[name + ".json"]
    index, origin, size = check_proof(data, files[name + ".tlog-proof"].decode(), key)
    entry = json.loads(data)
    if (entry["index"], entry["ledger"], key[0]) != (index, origin, origin):
        raise Wrong(f"{name}: says of itself that it is another entry")
    for item in entry["objects"]:
        content = files.get("data/objects/" + item["sha256"], b"")
        if sha256(content).hex() != item["sha256"] or len(content) != item["bytes"]:
            raise Wrong(f"{name}: object {item['sha256']} ({item['role']}) is not what was recorded")
    return entry, size


def check_record(files, entry):
    """Checks that the record is the one that the entry speaks of."""
    act, records = entry["act"], [o for o in entry["objects"] if o["role"] == "record"]
    if act["kind"] != "judged" or len(records) != 1:
        raise Wrong("data/entry: not the entry of a judged lot with its record")
    record = json.loads(files["data/objects/" + records[0]["sha256"]])
    pairs = [(record["record"], act["record"]), (record["verdict"], act["verdict"])]
    pairs += [(record["lot"].get(name), act[name]) for name in ("lot", "part", "supplier")]
    if any(found != said for found, said in pairs):
        raise Wrong(f"the record says something else than its entry: {pairs}")
    return record


def signs(key, note):
    try:
        return bool(open_note(note, key))
    except Wrong:
        return False


def check_approvals(files, entry, record, key):
    """Checks the signed approvals, and that the record says of them what they are."""
    names = sorted(p[:-5] for p in files if p.startswith("data/approvals/") and p.endswith(".json"))
    entries = [check_entry(files, name, key)[0] for name in names]
    sites = [o["sha256"] for e in [entry, *entries] for o in e["objects"] if o["role"] == "site"]
    lines = files.get("data/approval-keys.txt", b"").decode().splitlines()
    if not all(any(line.encode() in files["data/objects/" + site] for site in sites) for line in lines):
        raise Wrong("data/approval-keys.txt: a key that no site file lists")
    at, found = {e["act"]["statement"]: e["index"] for e in entries}, []
    for item in [o for o in entry["objects"] if o["role"] == "approval"]:
        note = files["data/objects/" + item["sha256"]].decode()
        by = [key[0] for key in map(read_key, lines) if signs(key, note)]
        said = dict(line.split(": ", 1) for line in note.split("\n\n")[0].split("\n")[1:])
        if not by or said["ledger"] != entry["ledger"] or not int(said["entries"]) <= at[note] < entry["index"]:
            raise Wrong("an approval is not signed by a key that a site file lists, or is of another ledger or time")
        if any((o["name"], o["sha256"]) == (said["file"], said["sha256"]) for o in entry["objects"]):
            found.append((said["file"], said["sha256"], by[0], at[note], said["meaning"]))
    told = [tuple(a[k] for k in ("file", "sha256", "by", "entry", "meaning")) for a in record.get("approvals", [])]
    if sorted(told) != sorted(found):
        raise Wrong("the record says of its approvals what they are not")
    if record.get("site", {}).get("approval") == "required" and record["verdict"] != "hold" and len(told) < 3:
        raise Wrong("the record was made without the approvals that its site file demands")


def verify(folder, trusted):
    files = check_bag(folder)
    packed = read_key(files["data/public-key.txt"].decode())
    key = read_key(trusted) if trusted else packed
    if key != packed:
        raise Wrong("the key in the package is not the one that was given")
    entry, size = check_entry(files, "data/entry", key)
    record = check_record(files, entry)
    check_approvals(files, entry, record, key)
    certificates = set()
    for name in sorted(p[:-5] for p in files if p.startswith("data/history/") and p.endswith(".json")):
        act = check_entry(files, name, key)[0]["act"]
        if act.get("record") != record["record"]:
            raise Wrong(f"{name}: about another record")
        certificates.add(act.get("certificate"))
    pdf = files.get("data/certificate.pdf")
    if pdf is not None and certificates - {None} and sha256(pdf).hex() not in certificates:
        raise Wrong("data/certificate.pdf: not a certificate that the ledger knows")
    anchor = "by the key given" if trusted else "by the key in the package, which proves nothing of who made it"
    print(f"ok: {record['record']}, {record['verdict']}: entry {entry['index']} of {size}, signed {anchor}")
    return 0


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("package")
    parser.add_argument("--key", help="the ledger's public key, as the site gave it to you")
    arguments = parser.parse_args()
    try:
        return verify(arguments.package, arguments.key)
    except (Wrong, ValueError, KeyError, TypeError, OSError, IndexError, AttributeError) as error:
        print(f"wrong: {error!r}" if not isinstance(error, Wrong) else f"wrong: {error}")
        return 1


if __name__ == "__main__":
    sys.exit(main())
