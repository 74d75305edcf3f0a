# Checks that an entry of a Platebook ledger stands under a signed seal. Needs Python 3.8 or later, nothing else:
#     python3 check-proof.py PROOF.json [KEY]
# KEY (name+hash+base64) is the verifier key as you know it from elsewhere, such as a paper. Without it the proof's own
# is used, and the proof is worth as much as whoever handed it to you. Exit status 0: it holds. 1: it does not.
# Standards: RFC 9162 section 2.1 (tree), C2SP signed-note and tlog-checkpoint (seal), RFC 8032 section 5.1 (Ed25519).

import base64, hashlib, json, sys, urllib.parse

P = 2**255 - 19
Q = 2**252 + 27742317777372353535851937790883648493
D = -121665 * pow(121666, P - 2, P) % P

def require(holds, what):
    if not holds: raise ValueError(what)

def bytes_from(text):  # base64 in its one proper spelling
    require(base64.b64encode(base64.b64decode(text)).decode() == text, "not proper base64: " + text)
    return base64.b64decode(text)

def sha256(*parts):
    return hashlib.sha256(b"".join(parts)).digest()

def add(a, b):  # RFC 8032 section 5.1.4, extended coordinates
    x, y = (a[1] - a[0]) * (b[1] - b[0]) % P, (a[1] + a[0]) * (b[1] + b[0]) % P
    t, z = 2 * a[3] * b[3] * D % P, 2 * a[2] * b[2] % P
    return (y - x) * (z - t) % P, (z + t) * (y + x) % P, (z - t) * (z + t) % P, (y - x) * (y + x) % P

def times(n, point):
    total = (0, 1, 1, 0)
    while n:
        if n & 1: total = add(total, point)
        point, n = add(point, point), n >> 1
    return total

def point_from(encoded):  # RFC 8032 section 5.1.3
    y = int.from_bytes(encoded, "little")
    sign, y = y >> 255, y & ((1 << 255) - 1)
    require(y < P, "bytes that are no point of the curve")
    square = (y * y - 1) * pow(D * y * y + 1, P - 2, P) % P
    x = pow(square, (P + 3) // 8, P)
    if (x * x - square) % P: x = x * pow(2, (P - 1) // 4, P) % P
    require((x * x - square) % P == 0 and (x or not sign), "bytes that are no point of the curve")
    return (x, y, 1, x * y % P) if x & 1 == sign else (P - x, y, 1, (P - x) * y % P)

def is_signature(public, text, signature):  # RFC 8032 section 5.1.7
    s = int.from_bytes(signature[32:], "little")
    if len(signature) != 64 or s >= Q: return False
    h = int.from_bytes(hashlib.sha512(signature[:32] + public + text).digest(), "little") % Q
    base = point_from((4 * pow(5, P - 2, P) % P).to_bytes(32, "little"))
    left, right = times(s, base), add(point_from(signature[:32]), times(h, point_from(public)))
    return (left[0] * right[2] - right[0] * left[2]) % P == 0 and (left[1] * right[2] - right[1] * left[2]) % P == 0

def open_note(note, key):
    name, key_id, encoded = key.split("+", 2)
    public = bytes_from(encoded)
    require(len(public) == 33 and public[0] == 1, "the key is not one of Ed25519")
    require(sha256(name.encode() + b"\n", public)[:4].hex() == key_id, "the hash in the key is wrong")
    require("\n\n" in note and note.endswith("\n"), "the checkpoint is no signed note")
    text, lines = note[: note.rindex("\n\n") + 1], note[note.rindex("\n\n") + 2 : -1].split("\n")
    for dash, by, encoded in (line.split(" ") for line in lines):
        require(dash == "\u2014", "a signature line is malformed")
        if by == name and bytes_from(encoded)[:4].hex() == key_id:
            require(is_signature(public[1:], text.encode(), bytes_from(encoded)[4:]), "the signature is wrong")
            return text
    raise ValueError("this key has not signed the checkpoint")

def root_from(leaf, index, size, path):  # RFC 9162 section 2.1.3.2
    fn, sn, root = index, size - 1, leaf
    for each in map(bytes_from, path):
        require(len(each) == 32 and sn > 0, "the path is too long, or holds no hash")
        if fn & 1 or fn == sn:
            root = sha256(b"\1", each, root)
            while not fn & 1 and fn: fn, sn = fn >> 1, sn >> 1
        else:
            root = sha256(b"\1", root, each)
        fn, sn = fn >> 1, sn >> 1
    require(sn == 0, "the path is too short")
    return root

def check(proof, trusted):
    require(trusted in (None, proof["key"]), "the proof rests on another key than the one you gave")
    origin, size, root, *more = open_note(proof["checkpoint"], proof["key"])[:-1].split("\n")
    index, entry = proof["index"], json.loads(proof["entry"])
    require(size == str(proof["size"]) and 0 <= index < proof["size"], "size and index are not those of the checkpoint")
    require(entry["number"] == index + 1, "the entry has another number")
    require(entry["book"] == urllib.parse.unquote(origin), "the entry is of another book")
    found = root_from(sha256(b"\0", proof["entry"].encode()), index, proof["size"], proof["inclusion"])
    require(base64.b64encode(found).decode() == root, "the entry is not under the checkpoint")
    time = next((line[5:] for line in more if line.startswith("time ")), "an unknown time")
    named = (entry["number"], entry["type"], entry["book"], size, time)
    return "holds: entry %d (%s) of book %s is under the seal of %s entries of %s" % named

try:
    with open(sys.argv[1], encoding="utf-8") as file: document = json.load(file)
    print(check(document, sys.argv[2] if len(sys.argv) > 2 else None))
    if len(sys.argv) == 2: print("It rests on the key that came with it: " + document["key"])
except Exception as error:
    print("does not hold: %s" % error)
    sys.exit(1)
