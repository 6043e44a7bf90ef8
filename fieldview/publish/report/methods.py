"""What the report says of the methods, each with its source, and the cautions that go with the numbers."""

from __future__ import annotations

from dataclasses import dataclass

from fieldview.session.models import Session
from fieldview.session.steps import Fill, MedianTest, Smooth, SpreadTest, TimeTest


@dataclass(frozen=True)
class Method:
    """A sentence and where it comes from."""

    text: str
    source: str


ALWAYS = (
    Method(
        "Line integrals are those of the bilinear interpolant of the vectors, exact in every cell; closed "
        "contours are taken counter-clockwise, the normal points outward.",
        "Definitions; Stokes's and Gauss's theorems for the closures.",
    ),
    Method(
        "The random part of an integral is the root of w'Cw, with the weights w of every vector and the "
        "covariance C of their errors, filling and smoothing included.",
        "JCGM 100:2008, 5.2; JCGM 102:2011.",
    ),
    Method(
        "Systematic parts are carried by their sensitivities and combined as the root of their squares.",
        "JCGM 100:2008, 5.1.",
    ),
    Method(
        "The resolution gap is the cubic convolution line less the bilinear one; of both gaps a third of the "
        "square enters the combined uncertainty, as of a rectangular distribution.",
        "Keys (1981) IEEE Trans. ASSP 29:1153–1160; JCGM 100:2008, 4.3.7.",
    ),
    Method(
        "Means over the run carry the uncertainty of their effective number of independent samples.",
        "JCGM 100:2008, 4.2; the effective number from the integral time scale.",
    ),
)

BY_STEP = {
    MedianTest: Method(
        "Normalised median test: a vector is rejected where its distance from the median of its neighbours "
        "exceeds the threshold times their median residual plus a floor.",
        "Westerweel & Scarano (2005) Exp. Fluids 39:1096–1100.",
    ),
    SpreadTest: Method(
        "Spread test: rejected beyond limit × 1.4826 median absolute deviations from the frame's median.",
        "Hampel identifier; 1.4826 = 1/Φ⁻¹(0.75).",
    ),
    TimeTest: Method(
        "Time test: the same over the neighbouring frames.", "Hampel identifier; 1.4826 = 1/Φ⁻¹(0.75)."
    ),
    Fill: Method(
        "Filled vectors are weighted sums of measured ones; their random part follows from the weights, "
        "their bias from punching the same gaps into measured surroundings.",
        "Linear interpolation on triangles, or the solution of ∇² = 0 or ∇⁴ = 0 across the gap.",
    ),
    Smooth: Method(
        "Smoothing is kept as the linear map it is, so that the correlation it brings is followed.",
        "Savitzky & Golay (1964) Anal. Chem. 36:1627–1639; "
        "Garcia (2010) Comput. Stat. Data Anal. 54:1167–1178.",
    ),
}

CAUTIONS = (
    "Uncertainties are standard uncertainties (k = 1) under the stated error model. They hold as far as that "
    "model does; what was not stated is named beside the numbers and is not in them.",
    "Errors of u and v are taken as independent of each other, and from frame to frame.",
    "A result used for ventilation, fume cupboards, loads on structures or any other decision that can hurt "
    "someone needs the method, the instrument and the competence that the local code asks for, and a person "
    "licensed to judge it. This report states how sure a number is; it does not certify an installation.",
)


def methods_of(session: Session) -> list[Method]:
    """The methods that the session used."""
    used = {type(step) for step in session.ledger if step.on}
    return [*ALWAYS, *(method for step, method in BY_STEP.items() if step in used)]
