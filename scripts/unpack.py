"""A second decoder of archives, written from docs/container.md alone: NumPy and nothing else.

usage: unpack.py FILE.grain [FOLDER]   prints what is inside; with FOLDER, writes each stream there as k.f64
"""

import struct
import sys

import numpy as np

MASK = (1 << 64) - 1


class Damaged(Exception):
    pass


# Checksums, counts, CBOR ------------------------------------------------------------------------------------------------

TABLE = []
for byte in range(256):
    for _ in range(8):
        byte = byte >> 1 ^ (0x82F63B78 if byte & 1 else 0)
    TABLE.append(byte)


def crc32c(data):
    crc = 0xFFFFFFFF
    for byte in data:
        crc = TABLE[(crc ^ byte) & 255] ^ crc >> 8
    return crc ^ 0xFFFFFFFF


def sealed(data):
    if len(data) < 4 or crc32c(data[:-4]) != struct.unpack("<I", data[-4:])[0]:
        raise Damaged("checksum")
    return data[:-4]


class Fields:
    def __init__(self, data):
        self.data, self.at = data, 0

    def take(self, count):
        if self.at + count > len(self.data):
            raise Damaged("cut")
        self.at += count
        return self.data[self.at - count : self.at]

    def byte(self):
        return self.take(1)[0]

    def count(self):
        value = shift = 0
        while True:
            byte = self.byte()
            value |= (byte & 127) << shift
            shift += 7
            if byte < 128:
                return value

    def signed(self):
        value = self.count()
        return value >> 1 ^ -(value & 1)

    def double(self):
        return struct.unpack("<d", self.take(8))[0]

    def single(self):
        return struct.unpack("<f", self.take(4))[0]

    def rest(self):
        return self.data[self.at :]


def cbor(fields):
    """One item of RFC 8949: numbers, texts, bytes, arrays, maps, doubles."""
    first = fields.byte()
    major, low = first >> 5, first & 31
    if major == 7:
        if low == 27:
            return struct.unpack(">d", fields.take(8))[0]
        raise Damaged("CBOR")
    if low < 24:
        value = low
    elif low < 28:
        value = int.from_bytes(fields.take(1 << (low - 24)), "big")
    else:
        raise Damaged("CBOR")
    if major == 0:
        return value
    if major == 1:
        return -1 - value
    if major == 2:
        return fields.take(value)
    if major == 3:
        return fields.take(value).decode()
    if major == 4:
        return [cbor(fields) for _ in range(value)]
    if major == 5:
        return {cbor(fields): cbor(fields) for _ in range(value)}
    raise Damaged("CBOR")


# Range coder, mixing, integers ------------------------------------------------------------------------------------------

TOP = 1 << 48


class RangeDecoder:
    def __init__(self, data):
        self.data, self.at = data, 6
        self.code = int.from_bytes(data[:6].ljust(6, b"\0"), "big")
        self.range = TOP - 1

    def settle(self):
        while self.range < 1 << 40:
            self.range <<= 8
            byte = self.data[self.at] if self.at < len(self.data) else 0
            self.at += 1
            self.code = (self.code << 8 | byte) & (TOP - 1)

    def bit(self, one):
        bound = (self.range >> 16) * one
        if self.code < bound:
            self.range = bound
            bit = 1
        else:
            self.code -= bound
            self.range -= bound
            bit = 0
        self.settle()
        return bit

    def raw(self, count):
        value = 0
        while count > 0:
            part = min(count, 16)
            count -= part
            self.range >>= part
            digit = min(self.code // self.range, (1 << part) - 1)
            self.code -= digit * self.range
            value = value << part | digit
            self.settle()
        return value


# fmt: off
KNOTS = [
    1, 1, 1, 1, 1, 1, 2, 2, 3, 4, 5, 6, 8, 10, 13, 17, 22, 28, 36, 47, 60, 77, 98, 126, 162, 208, 267, 342, 439, 562, 720, 922,
    1179, 1506, 1921, 2446, 3108, 3938, 4971, 6249, 7812, 9702, 11955, 14595, 17625, 21025, 24743, 28693, 32768, 36843, 40793,
    44511, 47911, 50941, 53581, 55834, 57724, 59287, 60565, 61598, 62428, 63090, 63615, 64030, 64357, 64614, 64816, 64974, 65097,
    65194, 65269, 65328, 65374, 65410, 65438, 65459, 65476, 65489, 65500, 65508, 65514, 65519, 65523, 65526, 65528, 65530, 65531,
    65532, 65533, 65534, 65534, 65535, 65535, 65535, 65535, 65535, 65535,
]
NOT_ZERO = [
    279, 331, 394, 468, 556, 661, 785, 932, 1107, 1315, 1560, 1851, 2195, 2602, 3082, 3649, 4315, 5097, 6013, 7083, 8327,
    9768, 11427, 13324, 15475, 17889, 20565, 23488, 26625, 29923, 33314, 36714, 40037, 43203, 46148, 48830, 51228, 53340,
    55178, 56763, 58120, 59277, 60259, 61090, 61792, 62385, 62884, 63305, 63660, 63958, 64209, 64420, 64597, 64747, 64872,
    64978, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000,
]
LONGER = [
    600, 600, 600, 600, 600, 600, 600, 600, 600, 664, 789, 939, 1116, 1327, 1578, 1876, 2231, 2652, 3151, 3744, 4446,
    5277, 6259, 7416, 8773, 10358, 12196, 14308, 16706, 19388, 22333, 25499, 28822, 32222, 35613, 38911, 42048, 44971,
    47647, 50061, 52212, 54109, 55768, 57209, 58453, 59523, 60439, 61221, 61887, 62454, 62934, 63341, 63685, 63976, 64221,
    64429, 64604, 64751, 64875, 64980, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000, 65000,
    65000, 65000, 65000, 65000, 65000, 65000, 65000,
]
# fmt: on

LIMIT = 12 * 256 - 1


def squash(x):
    x = max(-LIMIT, min(LIMIT, x)) + 12 * 256
    knot, part = x >> 6, x & 63
    return KNOTS[knot] + ((KNOTS[knot + 1] - KNOTS[knot]) * part >> 6)


def stretches():
    table = [LIMIT] * 65536
    p = 0
    for x in range(-LIMIT, LIMIT + 1):
        while p <= squash(x):
            table[p] = x
            p += 1
    return table


STRETCH = stretches()
SHARES = [131072 // (2 * n + 3) for n in range(401)]


class Slots(dict):
    """Slots made when they are first used: [fast, slow, seen]."""

    def __init__(self, first):
        self.first = first

    def __missing__(self, key):
        one, seen = self.first(key)
        self[key] = [one << 16, one << 16, seen]
        return self[key]


def learn(slot, bit):
    target = 0xFFFFFFFF if bit else 0
    fast, slow, seen = slot
    slot[0] = fast + ((target - fast) * SHARES[min(seen, 20)] >> 16)
    slot[1] = slow + ((target - slow) * SHARES[min(seen, 400)] >> 16)
    slot[2] = min(seen + 1, 400)


class Mixer:
    def __init__(self, slots):
        self.start = [65536 * 6 // 10 // slots] * (2 * slots) + [0]
        self.weights = {}

    def bit(self, coder, slots, which):
        weights = self.weights.setdefault(which, self.start[:])
        inputs = [STRETCH[p >> 16] for slot in slots for p in slot[:2]] + [256]
        dot = sum(w * i for w, i in zip(weights, inputs)) >> 16
        one = squash(max(-4096, min(4096, dot)))
        bit = coder.bit(one)
        error = (65536 if bit else 0) - one
        for k, i in enumerate(inputs):
            step = (i * error >> 10) * 6
            weights[k] = max(-(1 << 20), min(1 << 20, weights[k] + (step + 512 >> 10)))
        for slot in slots:
            learn(slot, bit)
        return bit


def scale_of(magnitude):
    if magnitude == 0:
        return 0
    octave = magnitude.bit_length() - 1
    quarter = (magnitude >> octave - 2 if octave >= 2 else magnitude << 2 - octave) & 3
    return min(4 * octave + quarter, 159)


def first_guess(key):
    model, context, node = key
    if model == "pair":
        return 32768, 1
    scale = context[1] if model == "slow" else context
    if node == 0:
        return 57000, 6
    if node == 1:
        return NOT_ZERO[min(scale, 95)], 6
    if node <= 65:
        return LONGER[min(max(scale + 8 - 4 * node, 0), 95)], 6
    return 32768, 6


def truncated(value, count):
    """Division towards zero."""
    return abs(value) // count * (1 if value >= 0 else -1)


class Integers:
    def __init__(self):
        self.lengths = Slots(first_guess)
        self.leading = Slots(lambda key: (32768, 4))
        self.signs = Slots(lambda key: (32768, 8))
        self.length_mixer, self.leading_mixer, self.sign_mixer = Mixer(4), Mixer(2), Mixer(2)
        self.quick = self.middle = self.slow = self.count = 0
        self.last = [0, 0]

    def next(self, coder, expected=None, kind=0):
        quick, slow = scale_of(self.quick), scale_of(self.slow)
        middle = scale_of(self.middle if expected is None else expected)
        base = min(max(slow // 4 - 10, 0), 60)
        pair = tuple(min(max(abs(v).bit_length() + 2 - base, 0), 15) for v in self.last)
        models = [("quick", quick), ("middle", middle), ("slow", (kind, slow)), ("pair", pair)]

        def decide(node, which):
            return self.length_mixer.bit(coder, [self.lengths[m, c, node] for m, c in models], which)

        if base > 0 and not decide(0, 0):
            length = base - 1
            while length > 0 and decide(66 + length, 12 + min(base - length, 11)):
                length -= 1
        else:
            length = base
            while length < 64 and decide(1 + length, 24 + min(length - base, 11)):
                length += 1
        magnitude = length
        if length >= 2:
            below = length - 1
            node = 1
            relative = min(max(length + 1 - base, 0), 7)
            for at in range(min(below, 3)):
                slots = [self.leading["length", min(length, 63), node], self.leading["slow", slow, relative, node]]
                node = 2 * node + self.leading_mixer.bit(coder, slots, (at, node))
            rest = below - min(below, 3)
            magnitude = node << rest | (coder.raw(rest) if rest else 0)
        value = magnitude
        if length > 0:
            signs = tuple((v > 0) - (v < 0) for v in self.last)
            if self.sign_mixer.bit(coder, [self.signs[signs], self.signs["all"]], 0):
                value = -magnitude
        self.remember(value)
        return value

    def remember(self, value):
        magnitude = min(abs(value), 1 << 40) << 8
        self.count = min(self.count + 1, 48)
        self.quick += truncated(magnitude - self.quick, min(self.count, 3))
        self.middle += truncated(magnitude - self.middle, min(self.count, 12))
        self.slow += truncated(magnitude - self.slow, self.count)
        self.last = [value, self.last[0]]


# Predictions ------------------------------------------------------------------------------------------------------------


class Covariance:
    def __init__(self, order, memory):
        self.order, self.fade = order, 1.0 - 1.0 / (1 << memory)
        self.history = np.zeros(order + 1)
        self.sums = [np.zeros(order + 1) for _ in range(order + 1)]
        self.weights = np.zeros(order)
        self.count = 0

    def next(self):
        total = 0.0
        for product in (self.weights * self.history[: self.order]).tolist():
            total += product
        return total

    def learn(self, sample):
        if self.order == 0:
            return
        self.history = np.concatenate([[sample], self.history[:-1]])
        newest = self.sums[0] * self.fade + sample * self.history
        self.sums = [newest] + self.sums[:-1]
        self.count += 1
        every = 1 if self.count < 4 * self.order else max(self.order // 2, 1)
        if self.count % every == 0:
            self.solve()

    def solve(self):
        n = self.order
        a = np.zeros((n, n))
        for j in range(n):
            a[j:, j] = self.sums[j + 1][: n - j]
            a[j, j] = self.sums[j + 1][0] + 1.0
        w = self.sums[0][1:].copy()
        for k in range(n):
            pivot = a[k, k]
            if not pivot > 1.0 / 1024.0:
                pivot = 1.0
            a[k, k] = pivot
            whole = a[k + 1 :, k].copy()
            factor = whole / pivot
            a[k + 1 :, k + 1 :] -= np.outer(whole, factor)
            a[k + 1 :, k] = factor
            w[k + 1 :] -= factor * w[k]
        w /= np.diag(a)
        for k in range(n - 1, -1, -1):
            w[:k] -= a[k, :k] * w[k]
        self.weights = w


class Gradient:
    def __init__(self, taps):
        self.weights, self.history = np.zeros(taps), np.zeros(taps)
        self.energy = self.foretold = 0.0

    def next(self):
        lanes = np.zeros(8)
        for products in (self.weights * self.history).reshape(-1, 8):
            lanes = lanes + products
        a, b, c, d, e, f, g, h = lanes.tolist()
        self.foretold = ((a + b) + (c + d)) + ((e + f) + (g + h))
        if not abs(self.foretold) < 2.0**60:
            self.weights[:] = 0.0
            self.foretold = 0.0
        return self.foretold

    def learn(self, sample):
        rate = 1.0 / 256.0 * (sample - self.foretold) / (self.energy + float(len(self.weights)))
        self.weights = self.weights + rate * self.history
        oldest = float(self.history[-1])
        energy = self.energy + (sample * sample - oldest * oldest)
        self.energy = energy if energy > 0.0 else 0.0
        self.history = np.concatenate([[sample], self.history[:-1]])


def to_signed(value):
    value &= MASK
    return value - (1 << 64) if value >> 63 else value


def ordered(bits, width):
    low = (1 << width - 1) - 1
    return -(bits & low) - 1 if bits >> width - 1 else bits


def from_ordered(order, width):
    low = (1 << width - 1) - 1
    return -order - 1 & low | 1 << width - 1 if order < 0 else order & low


def predicted(payload, count):
    fields = Fields(payload)
    kind = fields.byte()
    if kind == 0:
        numerator, denominator, first, stride = fields.double(), fields.double(), fields.signed(), fields.count()
    elif kind in (1, 2):
        offset, step = fields.double(), fields.double()
    elif kind in (3, 4):
        exponent = fields.signed()
    else:
        raise Damaged("scale")
    order, memory, taps = fields.byte(), fields.byte(), fields.count()
    exceptions, at = {}, 0
    for _ in range(fields.count()):
        at += fields.count()
        exceptions[at] = fields.double()
    coder, integers = RangeDecoder(fields.rest()), Integers()
    covariance, gradient = Covariance(order, memory), Gradient(taps) if taps else None
    out = np.zeros(count)
    for n in range(count):
        base = covariance.next()
        foretold = base + (gradient.next() if gradient else 0.0)
        if not abs(foretold) < 2.0**60:
            foretold = 0.0
        q = integers.next(coder)
        if kind in (0, 1):
            v = to_signed(int(np.floor(foretold + 0.5)) + q)
            sample = float(to_signed(first + v * stride)) * numerator / denominator if kind == 0 else offset + step * float(v)
            state = float(v)
        elif kind == 2:
            state = foretold + float(q)
            sample = offset + step * state
        else:
            width, form, whole = (32, "<f", "<I") if kind == 3 else (64, "<d", "<Q")
            near = foretold * 2.0 ** max(min(-exponent, 1023), -1022)
            near = float(np.float32(near)) if kind == 3 else near
            order_of = ordered(struct.unpack(whole, struct.pack(form, near))[0], width)
            bits = from_ordered(to_signed(order_of + q), width)
            sample = struct.unpack(form, struct.pack(whole, bits))[0]
            state = sample * 2.0 ** max(min(exponent, 1023), -1022)
        if gradient:
            gradient.learn(state - base)
        covariance.learn(state)
        out[n] = exceptions.get(n, sample)
    return out, kind in (1, 2)


# Cosine series ----------------------------------------------------------------------------------------------------------


def inverse_cosine(c):
    """The orthonormal inverse of the DCT-II, by one complex transform (Makhoul 1980)."""
    n = len(c)
    if n == 1:
        return c.copy()
    scaled = c * np.sqrt(n / 2.0)
    scaled[0] = c[0] * np.sqrt(float(n))
    turned = scaled - 1j * np.concatenate([[0.0], scaled[:0:-1]])
    v = np.fft.ifft(turned * np.exp(0.5j * np.pi * np.arange(n) / n)).real
    out = np.zeros(n)
    out[0::2] = v[: (n + 1) // 2]
    out[1::2] = v[::-1][: n // 2]
    return out


def cosine(payload, count, with_remainder):
    fields = Fields(payload)
    flags = fields.byte()
    trellis, degree = flags & 1, flags >> 1
    step = fields.single()
    factors = [fields.single() for _ in range(degree)]
    segments, lengths, kept, left = fields.count(), [], [], count
    for n in range(segments):
        lengths.append(fields.count() if n + 1 < segments else left)
        left -= lengths[-1]
        kept.append(fields.count())
    unit = fields.double() if with_remainder else 0.0
    coder, integers = RangeDecoder(fields.rest()), Integers()
    state, before, out = 0, [], []
    for length, used in zip(lengths, kept):
        values, levels, latest = np.zeros(length), [], 0
        for k in range(length):
            second = state >> 2 & 1
            level = 0
            if k < used:
                expected = (before[min(k * len(before) // length, len(before) - 1)] + latest) // 2 if before else None
                level = integers.next(coder, expected, second if trellis else 0)
                magnitude = min(abs(level), 1 << 40) << 8
                latest += truncated(magnitude - latest, 4)
                levels.append(magnitude)
            if trellis:
                values[k] = 2 * level - (((level > 0) - (level < 0)) if second else 0)
                a, b, c = state >> 2, state >> 1 & 1, state & 1
                state = (a ^ b) << 2 | (c ^ level & 1) << 1 | a
            else:
                values[k] = level
        if segments > 1:
            get = lambda k: levels[k] if k < len(levels) else 0
            before = [(2 * get(k) + get(k + 1) + get(max(k - 1, 0))) // 4 for k in range(length)]
        out.append(inverse_cosine(step * values))
    samples = np.concatenate(out)
    t = (np.arange(count) + 0.5) / count
    total = np.zeros(count)
    for factor in reversed(factors):
        total = (total + factor) * t
    samples = samples + total
    if with_remainder:
        rest = Integers()
        samples = samples + unit * np.array([float(rest.next(coder)) for _ in range(count)])
    return samples


# The file ---------------------------------------------------------------------------------------------------------------


def cast(samples, channel):
    kind = channel.get(2, 0)
    if kind == 1:
        return samples.astype(np.float32).astype(float)
    if kind == 2:
        return np.floor(samples * channel[4] / channel[3] + 0.5) * channel[3] / channel[4] + 0.0
    return samples


def block(data, header):
    fields = Fields(data)
    stream, first, rows = fields.count(), fields.count(), fields.count()
    gaps = [(fields.count(), fields.count()) for _ in range(fields.count())]
    mode, count = fields.byte(), rows - sum(missing for _, missing in gaps)
    exact = False
    if count == 0:
        values = np.zeros(0)
    elif mode == 1:
        values, needs_cast = predicted(fields.rest(), count)
        exact = not needs_cast
    elif mode in (2, 3):
        values = cosine(fields.rest(), count, mode == 3)
    elif mode == 4:
        kept = np.frombuffer(fields.rest(), "<f8")
        values = inverse_cosine(np.concatenate([kept, np.zeros(count - len(kept))]))
    else:
        raise Damaged("mode")
    channels = header[2]
    if not exact and stream < len(channels):
        values = cast(values, channels[stream])
    out, at = [], 0
    for before, missing in gaps:
        out += [values[at : at + before], np.full(missing, np.nan)]
        at += before
    return stream, first, np.concatenate(out + [values[at:]]), mode


def unpack(data):
    """Header, and every stream of the file."""
    if data[:4] != b"\x89GRN" or data[4] != 1:
        raise Damaged("not an archive of version 1")
    if data[-4:] != b"GRN\x8a":
        raise Damaged("cut")
    fields = Fields(data)
    fields.take(5)
    text = fields.take(fields.count())
    fields.take(4)
    sealed(data[: fields.at])
    header = cbor(Fields(text))
    coded = header.get(1, {}).get(1) == 1
    streams = [np.full(header[0], np.nan) for _ in range(len(header[2]) + coded)]
    modes = set()
    while data[fields.at] != 0:
        start = fields.at
        body = fields.take(fields.count())
        fields.take(4)
        sealed(data[start : fields.at])
        stream, first, values, mode = block(body, header)
        streams[stream][first : first + len(values)] = values
        modes.add(mode)
    index = sealed(data[fields.at : -8])
    if struct.unpack("<I", data[-8:-4])[0] != len(index) + 4:
        raise Damaged("index")
    return header, streams, modes


if __name__ == "__main__":
    with open(sys.argv[1], "rb") as file:
        header, streams, modes = unpack(file.read())
    print(header[0], "rows,", len(streams), "streams, modes", sorted(modes))
    for number, values in enumerate(streams):
        if len(sys.argv) > 2:
            values.astype("<f8").tofile(f"{sys.argv[2]}/{number}.f64")
