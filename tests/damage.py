"""Files as they come out of a bad transfer or a careless edit."""


def damaged(text, rng, letters, pieces):
    """The bytes of `text` with one to three places changed: a letter replaced, up to 15 bytes cut out, or a piece put in."""
    data = bytearray(text.encode())
    for _ in range(rng.randint(1, 3)):
        at = rng.randrange(len(data))
        match rng.randrange(3):
            case 0:
                data[at] = rng.choice(letters)
            case 1:
                del data[at : at + rng.randint(1, 15)]
            case 2:
                data[at:at] = rng.choice(pieces)
    return bytes(data)
