"""A way to call from Python what only kernels call."""

import numba


def called(helper):
    """`helper` as a compiled function that Python can call."""

    @numba.njit
    def call(*arguments):
        return helper(*arguments)

    return call
