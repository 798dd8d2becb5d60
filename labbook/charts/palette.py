"""The colours, mark shapes and lettering of every chart, on light and on dark paper."""

from dataclasses import dataclass

from labbook.registry.regimes import Regime

FONT = "Source Sans, Source Sans Pro, DejaVu Sans, sans-serif"
LABEL_SIZE = 12
TITLE_SIZE = 13
# to scale on the page too: left to itself Streamlit takes 20 pixels of the height, and a circle is flattened
NO_PADDING = {"left": 0, "right": 0, "top": 0, "bottom": 0}
SMALL_SIZE = 11
# mean advance of a letter per font size: on the wide side, so that a label judged to fit does fit
LETTER_WIDTH = 0.58


@dataclass(frozen=True)
class Paper:
    """Ground, panel and inks of one theme; rust is the run in hand and nothing else."""

    ground: str
    panel: str
    ink: str
    muted: str
    grid: str
    grey: str
    accent: str
    rust: str


LIGHT = Paper("#FDFCF9", "#F1EFE8", "#20262A", "#5A6468", "#E4E1D8", "#8B9195", "#0B6E75", "#B5452C")
DARK = Paper("#14181A", "#1E2427", "#E6E3DA", "#A8AFAF", "#2C3336", "#83898C", "#4FB3B8", "#E8795A")


def paper(dark: bool) -> Paper:
    """The colours of the dark or the light theme."""
    return DARK if dark else LIGHT


@dataclass(frozen=True)
class Series:
    """The look of one group of runs: colour and mark shape belong together."""

    colour: str
    shape: str


_DIAGONAL_CROSS = (
    "M-1,-0.6L-0.6,-1L0,-0.4L0.6,-1L1,-0.6L0.4,0L1,0.6L0.6,1L0,0.4L-0.6,1L-1,0.6L-0.4,0Z"
)

# Okabe & Ito's set for colour-blind readers, without vermilion (too near the rust); their black is the ink
_OKABE_ITO = (
    ("#0072B2", "circle"),
    ("#E69F00", "square"),
    ("#009E73", "triangle-up"),
    ("#CC79A7", "diamond"),
    ("#56B4E9", "cross"),
    ("", "triangle-down"),
    ("#F0E442", _DIAGONAL_CROSS),
)

MOST_SERIES = len(_OKABE_ITO)
OTHER = "other"


def series(dark: bool) -> tuple[Series, ...]:
    """Colour and shape of the first to the seventh group, in their fixed order."""
    return tuple(Series(colour or paper(dark).ink, shape) for colour, shape in _OKABE_ITO)


def other_series(dark: bool) -> Series:
    """The look of all groups that have no name of their own in the legend."""
    return Series(paper(dark).grey, "circle")


BAND_OPACITY = 0.20

BAND_HUES: dict[str, str] = {
    "creeping": "#0E8F98",
    "nearly creeping": "#3FA34D",
    "transitional": "#E0A21B",
    "inertial": "#A65FA8",
    "stiff tail": "#E0A21B",
    "working tail": "#0E8F98",
    "floppy tail": "#A65FA8",
    "cruising": "#0E8F98",
}
_SPARE_HUES = ("#5B7FC7", "#3FA34D", "#E0A21B", "#A65FA8", "#0E8F98")


# the colours that a group may give a regime, by name: Okabe & Ito (2008)
REGIME_HUES: dict[str, str] = {
    "orange": "#E69F00", "sky": "#56B4E9", "green": "#009E73", "yellow": "#F0E442", "blue": "#0072B2",
    "purple": "#CC79A7",
}  # fmt: skip


def band_hue(regime: Regime, position: int = 0) -> str:
    """The hue of a regime, drawn at 20 % opacity: its own colour, that at birth, else one by its position."""
    own = REGIME_HUES.get(regime.colour)
    return own or BAND_HUES.get(regime.name, _SPARE_HUES[position % len(_SPARE_HUES)])


def text_width(text: str, size: float = LABEL_SIZE) -> float:
    """About how many pixels a text takes at a font size."""
    return len(text) * size * LETTER_WIDTH


def theme(dark: bool, ground: bool = False) -> dict:
    """The Vega-Lite config of a theme: transparent on the page, or on its ground colour for a file."""
    colours = paper(dark)
    return {
        "background": colours.ground if ground else "transparent",
        "font": FONT,
        "view": {"stroke": None},
        "axis": {
            "labelColor": colours.ink,
            "titleColor": colours.ink,
            "labelFontSize": LABEL_SIZE,
            "titleFontSize": TITLE_SIZE,
            "titleFontWeight": "normal",
            "titlePadding": 10,
            "titleLimit": 0,
            "labelLimit": 0,
            "labelPadding": 6,
            "labelOverlap": True,
            "gridColor": colours.grid,
            "domainColor": colours.muted,
            "tickColor": colours.muted,
            "tickSize": 4,
        },
        "legend": {
            "orient": "top",
            "labelColor": colours.ink,
            "titleColor": colours.muted,
            "labelFontSize": TITLE_SIZE,
            "titleFontSize": LABEL_SIZE,
            "titleFontWeight": "normal",
            "labelLimit": 0,
            "symbolSize": 110,
            "symbolOpacity": 1,
            "columnPadding": 16,
            "rowPadding": 4,
            "offset": 8,
        },
        "title": {
            "color": colours.muted,
            "subtitleColor": colours.muted,
            "fontSize": LABEL_SIZE,
            "fontWeight": "normal",
            "anchor": "start",
        },
        "text": {"color": colours.ink, "font": FONT, "fontSize": LABEL_SIZE},
    }
