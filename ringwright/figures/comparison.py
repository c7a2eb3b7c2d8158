"""Pictures of a comparison: posteriors with the prior, the conversion factor over scenes, predicted against
observed diameter.

Each is drawn by a file of its own beside this one; here they are named and written. Angles in µas, masses in
powers of ten of the solar mass, the conversion factor k = d/θ_g without a unit.
"""

from __future__ import annotations

from pathlib import Path

from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from ringwright.comparing.results import Comparison
from ringwright.figures.diameters import diameters
from ringwright.figures.factors import factors
from ringwright.figures.posteriors import posteriors
from ringwright.products import written_whole

DPI = 150
PICTURES = {"posterior": posteriors, "factor": factors, "diameter": diameters}


def draw_comparison(comparison: Comparison, stem: str | Path) -> list[Path]:
    """Write the pictures of a comparison as PNGs whose names start with `stem`.

    Parameters
    ----------
    comparison : Comparison
    stem : path
        Folder and beginning of the name; "-posterior.png", "-factor.png" and "-diameter.png" are added.

    Returns
    -------
    list of Path
        What was written; nothing when no scene fits.
    """
    if comparison.curves.theta_g is None:
        return []
    name = comparison.observation.name
    return [
        _write(draw(comparison), path, name)
        for draw, path in zip(PICTURES.values(), targets(stem), strict=True)
    ]


def targets(stem: str | Path) -> list[Path]:
    """The files that `draw_comparison` writes."""
    return [Path(f"{stem}-{name}.png") for name in PICTURES]


def _write(figure: Figure, path: Path, name: str) -> Path:
    FigureCanvasAgg(figure)
    with written_whole(path) as temporary:
        figure.savefig(temporary, format="png", dpi=DPI, metadata={"Software": "ringwright", "Title": name})
    return path
