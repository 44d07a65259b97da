"""A plain kernel that ends with the worker that started it.

Run as `python -m trunnion.calculations.kernel -f CONNECTION_FILE`. On Linux the system itself ends it when its
worker dies, whatever it is doing; elsewhere ipykernel's own watch on the parent process does, within about a second.
"""

from __future__ import annotations

import sys


def die_with_parent() -> None:
    """Ask Linux to kill this process when the one that started it ends; elsewhere do nothing."""
    if sys.platform != "linux":
        return
    import ctypes
    import signal

    pr_set_pdeathsig = 1
    ctypes.CDLL(None, use_errno=True).prctl(pr_set_pdeathsig, signal.SIGKILL)


def main() -> None:
    """Start the kernel."""
    die_with_parent()
    from ipykernel import kernelapp

    kernelapp.launch_new_instance()


if __name__ == "__main__":
    main()
