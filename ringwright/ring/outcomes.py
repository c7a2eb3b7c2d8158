"""`RingOutcome`: how a measurement of a ring can end, by severity, each with the sentence a user needs.

The conditions are step 7 of the estimator in docs/measuring.md, which follows the definitions of EHT
Collaboration 2019 (paper IV, ApJL 875 L4, section 9, from memory). No units.
"""

from __future__ import annotations

from enum import IntEnum


class RingOutcome(IntEnum):
    """What came of looking for a ring.

    RING, WIDTH_LIMIT and OPEN come with a diameter; with the others every reading is NaN.
    """

    RING = 0
    WIDTH_LIMIT = 1
    OPEN = 2
    NO_RING = 3
    OFF_FIELD = 4
    TOO_COARSE = 5
    EMPTY = 6

    @property
    def sentence(self) -> str:
        """What this outcome means, in one sentence."""
        return _SENTENCES[self]

    @property
    def has_diameter(self) -> bool:
        """Whether a diameter comes with it."""
        return self <= RingOutcome.OPEN


_SENTENCES = {
    RingOutcome.RING: "A closed ring was found and its width is resolved.",
    RingOutcome.WIDTH_LIMIT: (
        "A closed ring was found, but along more than a third of the directions its brightness never falls "
        "to half: the width is a lower limit, or missing where no direction is resolved."
    ),
    RingOutcome.OPEN: (
        "The ring does not close at this dynamic range: its faintest part is too faint beside the brightest; "
        "the numbers describe an arc."
    ),
    RingOutcome.NO_RING: (
        "There is no ring at this resolution: brightness does not peak around a darker middle everywhere."
    ),
    RingOutcome.OFF_FIELD: (
        "The ring lies closer to the edge of the image than one resolution: render or cut a larger field."
    ),
    RingOutcome.TOO_COARSE: (
        "A pixel is larger than a third of the resolution: use finer pixels or a coarser resolution."
    ),
    RingOutcome.EMPTY: "The image holds no light to measure.",
}
