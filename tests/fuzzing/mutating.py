"""Files as careless edits, bad transfers and ill will make them: mutations of good files."""

WORDS = [
    b",", b";", b"\t", b"\n", b"\r", b"\r\n", b'"', b"'", b"#", b" ", b"-", b"+", b".", b"e9", b"1e308", b"1e-320", b"0", b"-0.0", b"nan", b"inf", b"\0", b"\xff",
    b"\xef\xbb\xbf", b"\xc3\xa4", b"%", b"(", b")", b"[", b"]", b"{", b"}", b"=", b"<", b">", b"&#0;", b"${", b"1_0", b"0x1", b"99999999999999999999", b"t_s", b"t_ms", b"x_mm",
    b"G02", b"G03", b"G04", b"G17", b"G18", b"G19", b"G91", b"X", b"I0", b"J0", b"K", b"F0", b"F", b"M02", b"N", b"GOTO/", b"FROM/", b"GODLTA/", b"MULTAX", b"FEDRAT/", b"RAPID",
    b"$", b"$$", b"UNITS/", b"INCHES", b"FINI", b"line", b"arc", b"curve", b"process", b"label", b"null", b"true", b'"a": ', b"[[", b"joint", b"limit", b"lower", b"mimic", b"1e5",
]  # fmt: skip


def mutated(data, rng, others=()):
    """The bytes with one to five changes."""
    data = bytearray(data)
    for _ in range(rng.choice((1, 1, 1, 2, 2, 3, 5))):
        at = rng.randrange(len(data) + 1)
        match rng.randrange(9):
            case 0:
                data[at : at + 1] = bytes([rng.randrange(256)])
            case 1:
                del data[at : at + rng.choice((1, 2, 8, 40))]
            case 2:
                data[at:at] = rng.choice(WORDS)
            case 3:
                data[at : at + rng.randrange(1, 5)] = rng.choice(WORDS)
            case 4:
                data[at:at] = data[at : at + rng.choice((3, 30, 200))]
            case 5 if data:
                data[at % len(data)] ^= 1 << rng.randrange(8)
            case 6:
                lines = bytes(data).split(b"\n")
                a, b = rng.randrange(len(lines)), rng.randrange(len(lines))
                lines[a], lines[b] = lines[b], lines[a]
                data = bytearray(b"\n".join(lines))
            case 7:
                data[at:at] = rng.choice(WORDS) * rng.choice((2, 20, 300))
            case 8 if others:
                other = rng.choice(others)
                data[at:] = other[rng.randrange(len(other)) :]
    return bytes(data[:8000])
