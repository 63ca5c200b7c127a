"""Random and mutated exports and run sheets, to try what breaks the reader."""

from __future__ import annotations

import random
from collections.abc import Sequence

__all__ = ["PIECES", "mutated", "piled", "seed_inputs"]

PIECES: tuple[bytes, ...] = (
    b"Time (s)", b"Area (cm^2)", b"Pressure (mN/m)", b"Mma (A^2)", b"APL in \xc3\x85\xc2\xb2",
    b"T", b"t", b"(", b"[", b"\xb5", b"\xff\xfe", b"\xef\xbb\xbf", b"\x00", b"\r", b"\n", b"\r\n",
    b"\n\n", b",", b";", b"\t", b" ", b"  ", b"|", b"1", b"2.5", b"-3,5", b"1e5", b"1e999",
    b"-1e-400", b"nan", b"inf", b"-inf", b"1_000", b"0x1f", b"1.234,5", b"1,234.5", b"9", b'"',
    b"'", b'""', b"#", b"=cmd|' /C calc'!A0", b"09:15:00", b"2031-05-06", b"99:99:99",
    b"31/02/2031 10:00", b"12:00 PM", b"\xc2\xa0", b"\xe2\x88\x92", b"\xe2\x80\xa8", b"\x1a",
    b"\x85", b"...", b"-", b"n/a", b"PK\x03\x04", b"xl/", b"\xd0\xcf\x11\xe0", b"(furlong)",
    b"mN/m", b"/", b"_", b"^", b"e", b"D", b"+", b"\xf0\x9f\xa7\xaa", b"[film]", b"volume = ",
    b"[[columns]]", b"role", b"index = 1e400",
)  # fmt: skip


def seed_inputs() -> list[bytes]:
    """A few small valid exports and sheets to start from."""
    rows = [(i * 2.0, 240.0 - 4.0 * i, 0.05 + 0.02 * i * i) for i in range(30)]
    plain = "Time (s),Area (cm^2),Pressure (mN/m)\n" + "".join(
        f"{t},{a},{p:.3f}\n" for t, a, p in rows
    )
    comma = plain.replace(",", ";").replace(".", ",")
    blank = "# " + plain.replace(",", "  ")
    clock = "Clock;Area per molecule (Å²);Surface tension (mN/m)\n" + "".join(
        f"09:{int(t) // 60:02d}:{int(t) % 60:02d};{a / 10:.2f};{72 - p:.2f}\n" for t, a, p in rows
    )
    figure = "# APL in Å², π in mN/m.\n" + "".join(f"{a / 3:.6f}, {p:.6f}\n" for _, a, p in rows)
    sheet = (
        '[film]\nname = "a"\nmolar_mass = "300 g/mol"\nconcentration = "1.00 ± 0.01 mg/mL"\n'
        'volume = "50 µL"\n[[columns]]\nrole = "pressure"\nindex = 3\nunit = "mN/m"\n'
    )
    texts = [plain, comma, blank, clock, figure, sheet]
    encoded = [text.encode() for text in texts]
    return [
        *encoded,
        comma.encode("utf-16"),
        clock.encode("latin-1"),
        plain.replace("\n", "\r").encode(),
    ]


def piled(rng: random.Random) -> bytes:
    """A pile of pieces that mean something to the reader."""
    return b"".join(rng.choice(PIECES) for _ in range(rng.randint(0, 120)))


def mutated(rng: random.Random, seeds: Sequence[bytes]) -> bytes:
    """One seed with a few cuts, copies, flips and insertions."""
    data = bytearray(rng.choice(seeds))
    for _ in range(rng.randint(1, 8)):
        at = rng.randint(0, len(data))
        size = rng.choice((1, 1, 2, 5, 40, 400))
        action = rng.randrange(6)
        if action == 0:
            del data[at : at + size]
        elif action == 1:
            data[at:at] = rng.choice(PIECES)
        elif action == 2:
            data[at : at + size] = rng.choice(PIECES)
        elif action == 3:
            start = rng.randint(0, len(data))
            data[at:at] = data[start : start + size]
        elif action == 4 and at < len(data):
            data[at] = rng.randrange(256)
        else:
            data[at : at + size] = rng.randbytes(min(size, 20))
    return bytes(data)
