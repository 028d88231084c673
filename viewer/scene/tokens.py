"""Every colour and size that a picture uses: one owner for both themes. Lengths are pixels at 960 wide."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

RGB = tuple[float, float, float]


def rgb(colour: str) -> RGB:
    """``"#F7F6F2"`` → sRGB components in 0…1."""
    text = colour.lstrip("#")
    return int(text[0:2], 16) / 255, int(text[2:4], 16) / 255, int(text[4:6], 16) / 255


@dataclass(frozen=True)
class Tokens:
    """Colours of one theme, ``#RRGGBB``; ``energy`` and ``gain`` hold the nine stops of the two ramps."""

    background: str
    band: str  # note band
    rule: str
    ink: str
    soft: str  # soft text
    body: str  # body base: the colour of zero energy
    mass: str  # lumped masses and supports
    body_edge: str
    mesh_edge: str
    ghost: str
    accent: str  # chosen things, flap line
    flap: str  # flap tint
    point: str  # functional point
    baseline: str
    modified: str
    test: str  # what a hammer test measured
    halo: str  # casing of pins and pegs
    energy: tuple[str, ...]
    gain: tuple[str, ...]


def _stops(text: str) -> tuple[str, ...]:
    return tuple(f"#{stop}" for stop in text.split())


THEMES: Mapping[str, Tokens] = MappingProxyType(
    {
        "light": Tokens(
            background="#F7F6F2",
            band="#EDEBE4",
            rule="#D9D7D0",
            ink="#1B2026",
            soft="#59626B",
            body="#D4D8DB",
            mass="#8C959D",
            body_edge="#2E343A",
            mesh_edge="#9AA1A7",
            ghost="#6F7780",
            accent="#0B63B5",
            flap="#2E86D6",
            point="#A3156F",
            baseline="#5A2F96",
            modified="#0A8066",
            test="#536400",
            halo="#FFFFFF",
            energy=_stops("D4D8DB DAC295 E2A256 E27A26 D75118 BC2F1E 991A31 750837 4E0E38"),
            gain=_stops("193978 2B62A7 568DC7 8DB7D7 D4D8DB D6B279 BE803E 97540B 653312"),
        ),
        "dark": Tokens(
            background="#14181D",
            band="#1C2127",
            rule="#2C333A",
            ink="#F1F3F5",
            soft="#A7B0B9",
            body="#444A4F",
            mass="#707983",
            body_edge="#C4CBD2",
            mesh_edge="#6E777F",
            ghost="#8E98A2",
            accent="#6DB7FF",
            flap="#58AAF2",
            point="#FF7CC8",
            baseline="#A283E6",
            modified="#5FE3C4",
            test="#B9D736",
            halo="#0B0E11",
            energy=_stops("444A4F 764557 A4415C CF444A E66437 F18937 F3B046 F8D577 F7F3BD"),
            gain=_stops("A8EBFB 66C1F1 4493CB 3B679A 444A4F 8B5738 C17B32 EAAC56 FBE3A3"),
        ),
    }
)

BASE_WIDTH = 960  # all pixel sizes below are meant at this width

# camera fit
MARGIN = 24
TOP = 84
BAND_HEIGHT = 96

# line widths
CONTOUR = 1.5
GHOST = 1.4
OVERLAY_SOLID = 2.4
OVERLAY_DASHED = 2.6
OVERLAY_GHOST = 1.3
FLAP_LINE = 2.4
BEAM = 3.0
NODE_LINE, NODE_CASING = 3.0, 6.4
TRACE, TRACE_CASING = 2.8, 5.6  # trace lines of a test
STEM = 1.6  # from where a test point rests to where it is
HIDDEN_OPACITY = 0.45  # hidden parts of the overlay's dashed contour
OVERLAY_TINT = 0.30  # teal in body base
REGION_TINT, REGION_LINE = 0.45, 3.8  # what only one of two overlaid designs has
FLAP_TINT = 0.30
MESH_EDGE_OPACITY = 0.55
MESH_EDGE_MEDIAN = 8  # px: mesh edges are drawn only when the median edge is longer
FAN_OPACITY = 0.22

# lengths as shares of the body's diagonal
DASH, DASH_GAP = 0.017, 0.012
DOT, DOT_GAP = 0.004, 0.010
PIN_RADIUS = 0.0042
TEST_BEAD = 0.0070  # radius of a test point

CREASE_DEGREES = 32.0

# text
TEXT_NAME, TEXT, TEXT_SMALL = 21, 16, 14
BAR_WIDTH, BAR_HEIGHT, BAR_TITLE, BAR_TICK = 230, 13, 15, 14
BASELINES = (36, 60, 83)
OVERFLOW_LINE = 24

# loops
FRAMES, FRAME_MS = 40, 40
