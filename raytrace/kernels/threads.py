"""One lock for every parallel kernel: numba's fallback threading layer aborts when two threads enter one at once."""

import threading

LOCK = threading.RLock()
