"""The help pages, by panel: title and text. Every formula stands with its source."""

from __future__ import annotations

_CANVAS = """
<p>Arrows over a map of one quantity. An arrow's tail is on its node. Arrows are thinned so that they
stand at
least 12 pixels apart; the legend says how many are left out. Colours and arrow length stay the same from
frame
to frame until you ask (View menu).</p>
<table>
<tr><td>solid arrow</td><td>measured</td></tr>
<tr><td>arrow with a ring at its tail</td><td>filled from its surroundings</td></tr>
<tr><td>cross</td><td>rejected</td></tr><tr><td>dot</td><td>missing</td></tr>
<tr><td>hatching</td><td>masked</td></tr></table>
<p>Wheel: zoom at the pointer. Right drag: zoom to a box. Middle drag, or Space and drag: pan. F or a
double click: fit. A tap on
Space:
play.</p>
<p>Seed (S) draws the streamline through a place: fourth-order Runge–Kutta steps of a quarter spacing through
the bilinear interpolant. Ctrl snaps a place to the nearest node, or to a corner of another region.</p>
<p>Drawing: click corners, Return or a double click closes, Backspace takes one back, Esc drops the drawing,
Shift keeps it straight or square. Drag a region's handles or its inside with Move (V); the numbers
follow.</p>
"""

_LEDGER = """
<p>What was done to the vectors, line by line, from the run's own files. A line can be switched off,
changed,
moved or taken out; what stands above it is not computed again. The measurement itself is never changed.</p>
<p><b>Median test.</b> A vector is rejected where |U − U<sub>m</sub>| / (r<sub>m</sub> + ε) exceeds the
threshold; U<sub>m</sub> and r<sub>m</sub> are the medians of its neighbours and of their residuals.
<span class="source">Westerweel &amp; Scarano (2005) Exp. Fluids 39:1096–1100. Usual: threshold 2,
ε 0.1 px.</span></p>
<p><b>Spread and time test.</b> Distance from the median beyond limit × 1.4826 MAD, in the frame or in time.
<span class="source">Hampel identifier; 1.4826 = 1/Φ<sup>−1</sup>(0.75).</span></p>
<p><b>Fill.</b> linear: triangles inside the hull of the measured nodes; harmonic: ∇² = 0 across the gap;
biharmonic: smooth in slope as well. Masked nodes are never filled. The uncertainty of filled vectors
follows
from the weights.</p>
<p><b>Smooth.</b> gaussian, Savitzky–Golay <span class="source">(1964)</span>, or penalised least squares
<span class="source">(Garcia 2010, Comput. Stat. Data Anal. 54:1167–1178)</span>. Smoothing correlates
errors,
which the uncertainties follow.</p>
"""

_QUANTITIES = """
<p>A card for every quantity: a small map, its range, and how many times its own uncertainty the largest
value
is. Click a card to show its map; the buttons draw it as iso-lines or colour the arrows by it.</p>
<table>
<tr><td>vorticity</td><td>ω = ∂v/∂x − ∂u/∂y, counter-clockwise positive</td></tr>
<tr><td>divergence</td><td>∇·u = ∂u/∂x + ∂v/∂y</td></tr>
<tr><td>shear strain rate</td><td>ε<sub>xy</sub> = ½ (∂u/∂y + ∂v/∂x)</td></tr>
<tr><td>swirling strength</td><td>imaginary part of the velocity gradient's eigenvalues
<span class="source">Zhou et al. (1999) J. Fluid Mech. 387:353–396</span></td></tr></table>
<p>The derivative scheme changes every card. Noise gain of ω, independent errors: central 1.00,
Richardson 1.34,
least squares 0.45, circulation 0.61, in σ/Δ; a quieter scheme blurs peaks more.
<span class="source">Raffel et al., Particle Image Velocimetry: A Practical Guide.</span></p>
"""

_READOUT = """
<p>The node nearest to the pointer: position, components with their uncertainty, the shown quantity, the
node's
status, and what became of its vector: which line rejected it, with residual and limit, and which line
filled
it. Probe (P) holds a place.</p>
"""

_REGIONS = """
<p>Contours are taken counter-clockwise, however they were drawn. The field between nodes is the bilinear
interpolant of its cell; its line integral is exact.</p>
<table>
<tr><td>Γ</td><td>∮ u·dl, circulation</td></tr>
<tr><td>Φ</td><td>∮ u·n ds, outward flux per unit depth</td></tr>
<tr><td>∬ω dA, ∬∇·u dA</td><td>area integrals of the derivative scheme's ω and ∇·u</td></tr>
<tr><td>Γ − ∬ω, Φ − ∬∇·u</td><td>closures: both ways agree within U where the field resolves the flow
<span class="source">(Green's theorem)</span></td></tr>
<tr><td>res. gap</td><td>cubic minus bilinear line; large where a core has only few nodes
<span class="source">Keys (1981) IEEE Trans. ASSP 29:1153–1160</span></td></tr>
<tr><td>window gap</td><td>what the measuring window of size W takes away:
(W²/24) ∮ ∂ω/∂n ds</td></tr>
<tr><td>measured</td><td>share of the contour that lies where there are vectors</td></tr>
<tr><td>index</td><td>turns of the velocity along the contour: +1 for a vortex, −1 for a saddle
<span class="source">(Poincaré)</span></td></tr>
<tr><td>∫u·dl, ∫u·n ds</td><td>for a line: along its direction, and across to the right</td></tr></table>
<p>u<sub>c</sub>² = u<sub>random</sub>² + Σ (c<sub>k</sub>u<sub>k</sub>)² + (resolution gap² + window
gap²)/3.
The random part is exact under the stated errors and their correlation.
<span class="source">JCGM 100:2008, 5.2; JCGM 102:2011.</span> A number smaller than its U is muted.</p>
"""

_DRAWER = """
<p><b>Around</b>: tangential and normal component along the contour. <b>Growth</b>: Γ and Φ as the
contour is
scaled about its centroid; a plateau of Γ means that the vortex is inside. <b>Over time</b>: the region's
number
on every frame, measured in the background on request. <b>Profile</b>: the components along a line.
<b>Budget</b>: what contributes how much to U.</p>
"""

_TIME = """
<p>A tick for every frame; its filled part is the share measured, once the frame has been looked at. Drag to
scrub, ←/→ step, Home and End, a tap on Space plays. <b>fluct.</b> shows the frame less the run's mean.
<b>mean</b> shows the mean of the measured vectors
over the
run.</p>
"""

_UNCERTAINTY = """
<p>Sigma is the standard uncertainty of one vector's component. Vectors of overlapping windows share
particles,
so their errors are correlated over window size / spacing nodes: 1 without overlap, 2 at 50 %, 4 at 75 %.
Parts
common to every vector do not average out; each is carried through with its own sensitivity.
<span class="source">JCGM 100:2008.</span></p>
"""

_CALIBRATION = """
<p>Metres per pixel from a distance that is known, and the time between the two pulses. The frame
interval is
another time: it spaces the frames of the run. Reversing one axis changes the sign of every vorticity and
Γ; the
flux keeps its sign.</p>
"""

_READING = """
<p>What a file does not say is asked for: units, which column is which, the pulse separation. Whether y
grows
downward and whether a positive v points downward are two questions; the sign of the strongest vorticity
shows a
mistake.</p>
"""

_RUN_CHECK = """
<p>Every frame is looked at once, after the ledger. Sigma is found in independent ways: from differences
between neighbours, between frames, and from the divergence of what should have none; ways that disagree are
said. The limits are common practice and stand in every verdict.</p>
<p><b>Peak locking</b> (pixel runs): how unevenly the fractional parts of the displacements are spread.
<b>Stuck vectors</b> move less than their noise makes them.</p>
"""

_OVER_TIME = """
<p><b>Spectrum</b>: Welch's method, Lomb–Scargle where frames are missing; the band holds 95 % for each
value. <span class="source">Welch (1967) IEEE Trans. AU 15:70–73; Scargle (1982) Astrophys. J.
263:835–853.</span> <b>Dominant frequency</b>: the sinusoid that fits best, with the uncertainty that the
rest leaves. <b>Autocorrelation</b>: its integral up to the first zero is the time scale T; N frames over a
time Θ are worth N<sub>eff</sub> = Θ / 2T independent ones. <b>Strouhal number</b>: f L / U with the
session's reference values and their uncertainties.</p>
"""

_STATISTICS = """
<p>One pass over the frames, filled vectors left out. Each map has its standard uncertainty from the
effective number of independent frames. Stresses hold the noise's variance too, unless it is taken off.
<span class="source">JCGM 100:2008, 4.2.</span></p>
"""

_MODES = """
<p>Proper orthogonal decomposition by snapshots; gaps are filled by the modes themselves. <span
class="source">Sirovich (1987) Q. Appl. Math. 45:561–571; Everson &amp; Sirovich (1995) J. Opt. Soc. Am. A
12:1657–1664.</span> Modes whose energies are closer than their uncertainty are mixed with each other. <span
class="source">North et al. (1982) Mon. Weather Rev. 110:699–706.</span></p>
"""

_CORRELATION = """
<p>Correlation coefficient of a component at one place with that at every other node. Its integral outward
to the first zero is the integral length; where the grid or a gap ends before, that is a lower bound.</p>
"""

_PHASE = """
<p>Frames are sorted into bins of the cycle, by a channel or by a frequency and their times. A bin of width
b keeps sin(πb)/(πb) of a variation once per cycle; jitter smears more. What is kept stands in the
table.</p>
"""

_CHOICES = """
<p>The region under every combination of defensible choices. The scatter is what another analyst might have
found; it stands beside the measurement's uncertainty and is no part of it.</p>
"""

_COMPARISON = """
<p>Difference of two frames with u² = u₁² + u₂² for random errors. With the same calibration in both,
systematic errors drop out as far as they are equal. Of normal errors 4.6 % of the nodes differ by more than
2 u.</p>
"""

_REPEATS = """
<p>Mean, standard deviation and s/√n over the repeats are Type A evaluations. The Birge ratio sets the
scatter against the stated random uncertainties; honest ones give about 1 ± 1/√(2(n − 1)).
<span class="source">JCGM 100:2008, 4.2; Birge (1932) Phys. Rev. 40:207–227.</span></p>
"""

_FIGURE = """
<p>One column of a journal's page is about 85 mm wide, two are 175 mm. Fonts are embedded; the same session
gives the same bytes. The caption beside the file says what was done and how sure the numbers are.</p>
"""

PAGES: dict[str, tuple[str, str]] = {
    "canvas": ("Canvas and tools", _CANVAS),
    "ledger": ("Ledger", _LEDGER),
    "quantities": ("Quantities", _QUANTITIES),
    "readout": ("Readout", _READOUT),
    "regions": ("Regions", _REGIONS),
    "drawer": ("Drawer", _DRAWER),
    "time_strip": ("Time strip", _TIME),
    "uncertainty_sheet": ("Uncertainty", _UNCERTAINTY),
    "calibration_sheet": ("Calibration and axes", _CALIBRATION),
    "reading_sheet": ("Reading files", _READING),
    "run_check": ("Run check", _RUN_CHECK),
    "over_time_sheet": ("Over time", _OVER_TIME),
    "statistics_sheet": ("Statistics over the run", _STATISTICS),
    "modes_sheet": ("Modes of the run", _MODES),
    "correlation_sheet": ("Two-point correlation", _CORRELATION),
    "phase_sheet": ("Phase averages", _PHASE),
    "choices_sheet": ("How much is the analyst?", _CHOICES),
    "comparison_sheet": ("Compare frames", _COMPARISON),
    "repeats_sheet": ("Repeats", _REPEATS),
    "figure_sheet": ("Figure", _FIGURE),
}
