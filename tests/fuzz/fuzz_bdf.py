"""``.bdf`` decks. See :mod:`harness`."""

from harness import fuzz_format

_DECK = b"""SOL 103
BEGIN BULK
GRID           1             0.0     0.0     0.0
GRID,2,,1.,0.,0.
GRID*                  3                             0.0          1.0-01*A
*A                   0.0
GRID    4               0.      0.      1.
CTETRA         1       1       1       2       3       4
CTRIA3,2,7,1,2,3
CONM2          9       4             2.0
INCLUDE 'input.bdf'
ENDDATA
"""

if __name__ == "__main__":
    fuzz_format("input.bdf", lambda folder: [_DECK, _DECK.replace(b"INCLUDE 'input.bdf'\n", b"")])
