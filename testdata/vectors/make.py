#!/usr/bin/env python3
"""Writes vectors.json: a small ledger, for implementers in any language.

It is a second implementation of the ledger's format in Python's standard
library, written from the published texts and not from this repository's Go:
RFC 8785 for the few kinds of values used here, RFC 6962 section 2.1 for hashes
and proofs, RFC 8032 for Ed25519, C2SP signed-note, tlog-checkpoint and
tlog-proof for the texts. A Go test holds the program to the file.

The key, the names and the joints are invented. The private key is public:
never use it for a ledger.
"""
import base64
import hashlib
import json

ORIGIN = "vectors.example/saltmarsh"
SEED = bytes(range(32))

# --- RFC 8032, Ed25519, the textbook way -----------------------------------
P = 2**255 - 19
L = 2**252 + 27742317777372353535851937790883648493
D = -121665 * pow(121666, P - 2, P) % P
BY = 4 * pow(5, P - 2, P) % P


def recover_x(y, sign):
    xx = (y * y - 1) * pow(D * y * y + 1, P - 2, P) % P
    x = pow(xx, (P + 3) // 8, P)
    if (x * x - xx) % P:
        x = x * pow(2, (P - 1) // 4, P) % P
    return P - x if x % 2 != sign else x


B = (recover_x(BY, 0), BY)


def add(p, q):
    (x1, y1), (x2, y2) = p, q
    k = D * x1 * x2 * y1 * y2 % P
    return ((x1 * y2 + x2 * y1) * pow(1 + k, P - 2, P) % P, (y1 * y2 + x1 * x2) * pow(1 - k, P - 2, P) % P)


def times(n, p):
    q = (0, 1)
    while n:
        if n & 1:
            q = add(q, p)
        p, n = add(p, p), n >> 1
    return q


def encode(p):
    return (p[1] | (p[0] & 1) << 255).to_bytes(32, "little")


H = hashlib.sha512(SEED).digest()
SCALAR = int.from_bytes(H[:32], "little") & ((1 << 254) - 8) | (1 << 254)
PUBLIC = encode(times(SCALAR, B))


def sign(message):
    r = int.from_bytes(hashlib.sha512(H[32:] + message).digest(), "little") % L
    point = encode(times(r, B))
    k = int.from_bytes(hashlib.sha512(point + PUBLIC + message).digest(), "little") % L
    return point + ((r + k * SCALAR) % L).to_bytes(32, "little")


# --- RFC 6962, section 2.1 --------------------------------------------------
def leaf(data):
    return hashlib.sha256(b"\x00" + data).digest()


def node(left, right):
    return hashlib.sha256(b"\x01" + left + right).digest()


def split(n):
    k = 1
    while 2 * k < n:
        k *= 2
    return k


def root(d):
    if not d:
        return hashlib.sha256(b"").digest()
    if len(d) == 1:
        return leaf(d[0])
    k = split(len(d))
    return node(root(d[:k]), root(d[k:]))


def path(m, d):
    if len(d) == 1:
        return []
    k = split(len(d))
    return path(m, d[:k]) + [root(d[k:])] if m < k else path(m - k, d[k:]) + [root(d[:k])]


def consistency(m, d, whole=True):
    if m == len(d):
        return [] if whole else [root(d)]
    k = split(len(d))
    if m <= k:
        return consistency(m, d[:k], whole) + [root(d[k:])]
    return consistency(m - k, d[k:], False) + [root(d[:k])]


# --- texts -------------------------------------------------------------------
def canonical(value):
    """RFC 8785 for ASCII names and for numbers that Python writes as it asks."""
    return json.dumps(value, sort_keys=True, separators=(",", ":"), ensure_ascii=False).encode()


def b64(data):
    return base64.b64encode(data).decode()


KEY = b"\x01" + PUBLIC
KEY_ID = hashlib.sha256(ORIGIN.encode() + b"\n" + KEY).digest()[:4]


def checkpoint(d):
    text = f"{ORIGIN}\n{len(d)}\n{b64(root(d))}\n"
    return f"{text}\n— {ORIGIN} {b64(KEY_ID + sign(text.encode()))}\n"


def proof(m, d):
    return "c2sp.org/tlog-proof@v1\n" + f"index {m}\n" + "".join(b64(h) + "\n" for h in path(m, d)) + "\n" + checkpoint(d)


def entry(i, kind, author, body):
    return {
        "type": kind,
        "id": f"01a231a1-fc7f-7eba-8972-0000000000{i:02x}",
        "at": f"2026-03-01T08:00:{i:02d}.250Z",
        "author": author,
        "body": body,
    }


ENTRIES = [
    entry(0, "key-added", "operator", {"key": "01a231a1-fc7f-7eba-8972-0000000000f0", "caller": "ada", "role": "analyst"}),
    entry(1, "record", "ada", {
        "subject": {"part": "SM-1200", "revision": "B", "joint": "hinge-upper", "aspect": ""},
        "note": "quotes \" and \\, an umlaut ü, a tab \t", "numbers": [0, -1, 0.5, 18000, 0.09782515717608153, 1e-7, 1e21],
    }),
    entry(2, "record", "ada", {"empty": {}, "list": [], "nothing": None, "yes": True}),
    entry(3, "sign-off", "ben", {"record": "01a231a1-fc7f-7eba-8972-000000000001", "role": "checked", "statement": "followed by hand"}),
    entry(4, "withdrawal", "ada", {"record": "01a231a1-fc7f-7eba-8972-000000000002", "reason": "wrong plate"}),
    entry(5, "key-revoked", "operator", {"key": "01a231a1-fc7f-7eba-8972-0000000000f0", "caller": "ada", "role": "analyst"}),
    entry(6, "release-decision", "vault", {"decision": "hold"}),
]


def main():
    data = [canonical(e).replace(b"1e-07", b"1e-7") for e in ENTRIES]
    sizes = range(len(data) + 1)
    print(json.dumps({
        "about": "A small ledger, written by make.py beside this file. Bodies are made up to exercise the form of bytes; a real record's body is described in DEVELOPERS.md. The private key is public: never use it.",
        "private_key": f"PRIVATE+KEY+{ORIGIN}+{KEY_ID.hex()}+{b64(bytes([1]) + SEED)}",
        "verifier_key": f"{ORIGIN}+{KEY_ID.hex()}+{b64(KEY)}",
        "entries": [{"envelope": e, "canonical": d.decode(), "record_digest": "sha256:" + leaf(d).hex()} for e, d in zip(ENTRIES, data)],
        "roots": [root(data[:n]).hex() for n in sizes],
        "checkpoints": [checkpoint(data[:n]) for n in sizes],
        "proofs": [proof(m, data) for m in range(len(data))],
        "consistency": [{"from": m, "to": n, "hashes": [b64(h) for h in consistency(m, data[:n])]} for n in sizes for m in range(1, n)],
    }, indent=1, ensure_ascii=False))


main()
