"""What is on show: the audit as given, the one shown now, and the one worker that makes another from it. Knows no widget library.

A change never waits for an older one: each request raises the generation, and a result whose generation has passed is dropped.
Callbacks come from the worker's thread.
"""

from concurrent.futures import ThreadPoolExecutor
from threading import Lock


class Session:
    """given: the audit as it came; shown: the one on show, never changed in place."""

    def __init__(self, audit):
        self.given = self.shown = audit
        self._lock = Lock()
        self._generation = 0
        self._worker = None

    def change(self, make, done, failed):
        """Run make(given) -> (audit, result) in the worker; then done(result), or failed(sentence) where it raises. The newest request wins.

        make does everything that takes long, `result` included; done only hands the result on.
        """
        with self._lock:
            self._generation += 1
            generation = self._generation
            if self._worker is None:
                self._worker = ThreadPoolExecutor(1, thread_name_prefix="pathaudit")
        return self._worker.submit(self._run, generation, make, done, failed)

    def cancel(self):
        """Drop whatever is under way; what is shown stays."""
        with self._lock:
            self._generation += 1

    def close(self):
        """Cancel and let the worker go."""
        self.cancel()
        with self._lock:
            worker, self._worker = self._worker, None
        if worker is not None:
            worker.shutdown(wait=False, cancel_futures=True)

    def _run(self, generation, make, done, failed):
        if generation != self._generation:
            return
        try:
            audit, result = make(self.given)
        except Exception as error:      # told to the user by `failed`: nothing above this thread would ever see it
            self._if_newest(generation, lambda: failed(f"{type(error).__name__}: {error}"))
            return
        self._if_newest(generation, lambda: self._take(audit, result, done))

    def _take(self, audit, result, done):
        self.shown = audit
        done(result)

    def _if_newest(self, generation, act):
        with self._lock:
            if generation == self._generation:
                act()
