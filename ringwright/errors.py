"""The one family of errors that a user can cause: the command line turns them into one clear message and
exit status 2.
"""

from __future__ import annotations


class InputError(ValueError):
    """Something that was given cannot be used; the message says what, what is accepted and what to do."""
