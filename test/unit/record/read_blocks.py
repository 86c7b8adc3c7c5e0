"""Columns of a record's blocks, from BLOCKS.md alone: read_blocks.py FILE TABLE [ID ...] prints a
JSON line {"block": row id, "column": id, "values": [...]} for each."""
import json, math, sqlite3, struct, sys, zlib

class Bytes:
    def __init__(self, b, at=0): self.b, self.at = b, at
    def take(self, form):
        value = struct.unpack_from("<" + form, self.b, self.at)
        self.at += struct.calcsize("<" + form)
        return list(value) if len(value) > 1 else value[0]
    def varint(self):
        byte = self.take("B")
        return byte & 127 | self.varint() << 7 if byte & 128 else byte
    def signed(self): return (lambda v: -(v + 1) // 2 if v & 1 else v // 2)(self.varint())
    def bits(self): return (byte >> j & 1 for byte in self.b[self.at:] for j in range(8))

def body(b, n):
    kind = b.take("B")
    if kind & 7 == 3: return [b.take("d") for _ in range(n)]
    if kind & 7 == 5: return [b.take("d")] * n
    if kind & 7 == 4: return (lambda t: [t[int(v)] for v in body(b, n)])([b.take("d") for _ in range(b.varint())])
    digits, offset, by = b.take("B") if kind & 32 else 0, b.signed(), kind >> 3 & 3
    slope, lag = b.take("d") if by == 1 else 0, b.varint() if by == 2 else 0
    shift, m = (b.take("B"), b.signed()) if by == 3 else (0, 0)
    w = []
    for i, r in enumerate([lambda: [b.signed()] * n, lambda: rice(b, n), lambda: rans(b, n)][kind & 7]()):
        p = math.floor(slope * i + 0.5) if by == 1 else w[i - lag] if by == 2 and i >= lag else 0
        if by == 3: p, m = m + (2 ** shift >> 1) >> shift, m + r
        w.append(p + r)
    return [((offset + v) % 2 ** 32 if kind & 64 else offset + v) / 10 ** digits for v in w]

def rice(b, n):
    k, r, used = b.take("B"), [], 0
    bits = b.bits()
    for _ in range(n):
        upper = 0
        while upper < 24 and next(bits): upper += 1
        u = upper << k | sum(next(bits) << j for j in range(k)) if upper < 24 else None
        used += upper if u is None else upper + 1 + k
        r.append(u if u is None else -(u + 1) // 2 if u & 1 else u // 2)
    b.at += (used + 7) // 8
    return [b.signed() if v is None else v for v in r]

def rans(b, n):
    raw, low, m = b.take("B"), b.signed(), b.varint()
    f = [x if x < 16 else (16 + (x & 15)) << (x >> 4) - 1 if x < 255 else 0 for x in b.take(f"{m + 1}B")]
    f = [x or (4096 - sum(f) if b.b[b.at - m - 1 + s] == 255 else 0) for s, x in enumerate(f)]
    slots = [(s, size, place) for s, size in enumerate(f) for place in range(size)]
    x, words, symbols = b.take("4I"), iter([b.take("H") for _ in range(b.varint())]), []
    for i in range(n):
        s, size, place = slots[x[i % 4] & 4095]
        x[i % 4] = size * (x[i % 4] >> 12) + place
        if x[i % 4] < 32768: x[i % 4] = x[i % 4] << 16 | next(words)
        symbols.append(s)
    assert x == [32768] * 4, "the states do not end where they began"
    bits = b.bits()
    r = [None if (lower := sum(next(bits) << j for j in range(raw))) is None or s == m else (low + s << raw) | lower for s in symbols]
    b.at += (n * raw + 7) // 8
    return [b.signed() if v is None else v for v in r]

def plain(b):
    n, count, _ = b.take("IHH")
    for c, form, _, at, base in [b.take("HBBId") for _ in range(count)]:
        letter = {1: "B", 2: "H", 4: "I", 8: "d"}.get(form)
        raw = struct.unpack_from(f"<{n}{letter}", b.b, at) if letter else [0] * n
        yield c, [v if form == 8 else base + v for v in raw]

def packed(b):
    n, count = b.varint(), b.varint()
    c, directory = 0, [(b.signed(), b.varint()) for _ in range(count)]
    for step, length in directory:
        c, at = c + step, b.at
        yield c, body(b, n)
        assert b.at == at + length, f"column {c} ends elsewhere"

if __name__ == "__main__":
    file, table, *ids = sys.argv[1:]
    for row, codec, crc, blob in sqlite3.connect(file).execute(f"SELECT rowid, codec, crc, blob FROM {table}"):
        assert zlib.crc32(blob) == crc, f"block {row} is damaged"
        for c, values in [plain, packed][codec](Bytes(blob)):
            if not ids or str(c) in ids: print(json.dumps({"block": row, "column": c, "values": values}))
