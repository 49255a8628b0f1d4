"""One worker for what takes long: the newest request wins, older ones end at their next step. Knows nothing of audits or widgets."""

from concurrent.futures import ThreadPoolExecutor
from threading import Lock


class Superseded(Exception):
    """Raised inside a piece of work that a newer request or a cancellation has made useless."""


class Worker:
    """Runs make(told) in a thread of its own, then done(result), or failed(sentence) where it raises; both come from that thread.

    told(words) tells a listener what is begun, and ends the work where it is no longer the newest.
    """

    def __init__(self, listener=lambda words: None):
        self._listener = listener
        self._lock = Lock()
        self._generation = 0
        self._pool = None

    def start(self, make, done, failed):
        """Ask for a piece of work; gives a Future that ends with it, with the sentence where it failed."""
        with self._lock:
            self._generation += 1
            generation = self._generation
            if self._pool is None:
                self._pool = ThreadPoolExecutor(1, thread_name_prefix="pathaudit")
            return self._pool.submit(self._run, generation, make, done, failed)

    def cancel(self):
        """Drop whatever is under way or waits."""
        with self._lock:
            self._generation += 1

    def close(self):
        """Cancel and let the thread go."""
        self.cancel()
        with self._lock:
            pool, self._pool = self._pool, None
        if pool is not None:
            pool.shutdown(wait=False, cancel_futures=True)

    def _run(self, generation, make, done, failed):
        def told(words):
            if generation != self._generation:
                raise Superseded
            self._listener(words)

        try:
            told("")
            result = make(told)
        except Superseded:
            return None
        except Exception as error:      # told to the user by `failed`: nothing above this thread would ever see it
            sentence = f"{type(error).__name__}: {error}"
            self._if_newest(generation, lambda: failed(sentence))
            return sentence
        self._if_newest(generation, lambda: done(result))
        return None

    def _if_newest(self, generation, act):
        with self._lock:
            if generation == self._generation:
                act()
