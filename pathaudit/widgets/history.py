"""A line of values that can be walked back and forth without limit."""


class History:
    """`now` is the value that holds. push() forgets what was undone; equal gestures replace each other, so that one drag is one step."""

    def __init__(self, first):
        self._values, self._at, self._gesture = [first], 0, None

    @property
    def now(self):
        return self._values[self._at]

    @property
    def can_undo(self):
        return self._at > 0

    @property
    def can_redo(self):
        return self._at < len(self._values) - 1

    def push(self, value, gesture=None):
        if value == self.now:
            return
        keep = self._at if gesture is not None and gesture == self._gesture and self._at else self._at + 1
        self._values[keep:] = [value]
        self._at, self._gesture = keep, gesture

    def undo(self):
        self._step(-1)

    def redo(self):
        self._step(1)

    def back_to(self, value):
        """Walk to the nearest place at which `value` held; one that its own gesture has replaced gets its place again, before what holds now."""
        places = [k for k, held in enumerate(self._values) if held == value]
        if not places:
            self._values.insert(self._at, value)
            places = [self._at]
        self._at, self._gesture = min(places, key=lambda k: abs(k - self._at)), None

    def _step(self, by):
        self._at = min(max(self._at + by, 0), len(self._values) - 1)
        self._gesture = None
