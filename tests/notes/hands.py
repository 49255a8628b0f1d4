"""What notes of many people and many hands look like, for tests by properties."""

from datetime import datetime

from hypothesis import strategies as st

from pathaudit.notes.values import Note, Notes, Pin, Place, Status, Version, sound

NASTY = ['"""', '""', '"', "\\", "\\u0041", "'''", "\r\n", "\r", "\n", "\n\n\n\n\n", "\0", "\x1b[31mred\x1b[0m", "\x7f", "\x85", "\u2028", "\u202e", "\ufeff", "#", "[x]", " ",
         "\t", "<script>alert(1)</script>", '"]]>', "]]>", "&amp;", "<<<<<<< ours", "\n=======\n", ">>>>>>> theirs", "aaaaaa | ", "aaaaaa |", "שלום עולם",
         "👩\u200d🏭", "e\u0301", "= 1", "aaaaaa.text = \"\"\"", "\ud83d", "\\\n", "${x}"]  # fmt: skip

texts = st.lists(st.one_of(st.sampled_from(NASTY), st.text(max_size=8)), max_size=6).map("".join).map(sound)
people = st.sampled_from(["Ann", "Bob", "Çiğdem O'Neil", 'Dee "D" \\ x'])
dates = st.datetimes(min_value=datetime(2026, 1, 1), max_value=datetime(2026, 1, 1, 0, 0, 30)).map(
    lambda d: d.isoformat(timespec="seconds") + "Z")
numbers = st.floats(-1e4, 1e4).map(lambda v: round(v, 3) + 0.0)
points = st.tuples(numbers, numbers, numbers)
places = st.one_of(st.none(), st.builds(Place, numbers, numbers, points, points, points, points, numbers))
pins = st.one_of(st.none(), st.builds(Pin, st.just("joint speed"), st.one_of(st.none(), texts.map(lambda t: f"j{t}")), st.sampled_from(["warn", "fail"]), numbers, numbers, texts,
                                      st.just((("arm", "0a1b2c"), ("tool", "3d4e5f")))))
values = st.recursive(st.one_of(texts, st.booleans(), st.integers(-10**9, 10**9), st.floats(allow_nan=False), st.datetimes(), st.dates(), st.times()),
                      lambda inner: st.one_of(st.lists(inner, max_size=3), st.dictionaries(texts, inner, max_size=3)), max_leaves=3)
extras = st.dictionaries(texts.map(lambda t: f"x{t}"), values, max_size=2).map(lambda d: tuple(sorted(((key,), value) for key, value in d.items())))


@st.composite
def fresh(draw, id=None):
    """A note as its author leaves it."""
    author, date = draw(people), draw(dates)
    return Note(id or draw(st.text("abcdef", min_size=6, max_size=6)), draw(st.floats(0, 100).map(lambda v: round(v, 3))),
                (Version(author, date, draw(texts)),), author, date, draw(places), draw(pins), Status(), (), draw(extras))


@st.composite
def worked_on(draw, note):
    """A note after a few edits, a settling, perhaps a deletion, by somebody."""
    for act in draw(st.lists(st.sampled_from(["edit", "edit", "settle", "delete"]), max_size=3)):
        by, date = draw(people), draw(dates)
        if act == "edit" and not note.deleted:
            note = note.edit(draw(texts), by, date)
        elif act == "settle" and not note.deleted:
            note = note.settle(draw(st.booleans()), by, date)
        elif act == "delete":
            note = note.delete(by, date)
    return note


@st.composite
def copies(draw, count):
    """What `count` people make of the same notes, each with some of their own, and what they began with."""
    ids = ["aaaaaa", "bbbbbb", "cccccc"]
    base = Notes(tuple(draw(fresh(id)) for id in ids[: draw(st.integers(0, 3))]))
    made = []
    for person in range(count):
        mine = [draw(worked_on(note)) for note in base.items]
        added = [draw(fresh(f"own{person}{k}")) for k in range(draw(st.integers(0, 2)))]
        made.append(Notes(tuple(mine + added)))
    return base, made
