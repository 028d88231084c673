"""``.inp`` decks. See :mod:`harness`."""

from harness import fuzz_format

_DECK = b"""*NODE, NSET=all
1, 0., 0., 0.
2, 1., 0., 0.
3, 0., 1., 0.
4, 0., 0., 1.
*ELEMENT, TYPE=C3D4, ELSET=body
1, 1, 2, 3,
4
*NSET, NSET=some, GENERATE
1, 3, 2
*NSET, NSET=more
some, 4
*ELEMENT, TYPE=S3
2, 1, 2, 3
*INCLUDE, INPUT=input.inp
"""

if __name__ == "__main__":
    fuzz_format("input.inp", lambda folder: [_DECK, _DECK[: _DECK.index(b"*INCLUDE")]])
