"""How each number of a view is computed, and where the method is published."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from fieldkit.detune.likelihood import MODEL_ERROR
from fieldkit.detune.scatter import PLACE_SCATTER_M, STIFFNESS_SCATTER_LN
from fieldkit.sheet import order_response
from fieldkit.sheet.tables import handbook_words
from fieldkit.signal.verdicts import LARGEST_RELATIVE_SD
from fieldkit.span.supports import UNKNOWN_SD_LN
from fieldkit.workup import Workup


@dataclass(frozen=True)
class Method:
    """One number, or a group of them."""

    number: str
    how: str
    source: str


TAP = (
    Method(
        "frequency, damping",
        "y(t) = sum Re[a exp(s t)] fitted to the transforms of all usable taps together, poles s = "
        "-zeta w + j w sqrt(1 - zeta^2) shared, amplitudes a free in each; weighted by the noise "
        "before the blow (maximum likelihood). Frequencies are undamped ones.",
        "variable projection: Golub and Pereyra 1973; Kaufman 1975",
    ),
    Method(
        "± of both",
        "one standard deviation: the Cramér-Rao bound of this record from the Fisher information, "
        "widened where the residual exceeds the noise and where the taps disagree; no mode is "
        f"claimed beyond {LARGEST_RELATIVE_SD:.0%} of its damping",
        "DerSimonian and Laird 1986; Satterthwaite 1946 (from memory)",
    ),
    Method(
        "struck twice",
        "short stretches of free decay lie in a subspace all taps share; one struck in its middle "
        "does not",
        "Scharf and Friedlander 1994, IEEE Trans. Signal Process. 42, 2146",
    ),
    Method(
        "response (h)",
        "H1 = sum X F* / sum |F|^2, H2 = sum |X|^2 / sum F X*, coherence their ratio, over blows",
        "ISO 7626-5; Bendat and Piersol, Random Data, chapter 6",
    ),
)
RUNNING = (
    Method(
        "lines, rms",
        "amplitudes from averaged spectra with a flat-top window, overlapping segments; "
        "velocity = acceleration / (2 pi f)",
        "Welch 1967; Heinzel, Rüdiger and Schilling 2002",
    ),
    Method("amplification", order_response.HOW, "Thomson, Theory of Vibration with Applications"),
    Method(
        "modes seen running",
        "poles that stay over many orders of a subspace identification, refined by the likelihood "
        "of the periodogram; the force is unknown, so they count for less than a tap",
        "Van Overschee and De Moor 1996; Whittle 1953 (from memory)",
    ),
    Method("levels (l)", "each line is told with its formula", "named beside each line; screening"),
)
SPAN = (
    Method(
        "computed modes",
        "M phi = (1/w^2) K phi of pipe elements with shear and rotary inertia; supports are "
        "springs, masses points with an offset; the mesh keeps its error below 0.05 %",
        "Przemieniecki 1968, ch. 5; Cowper 1966, J. Appl. Mech. 33, 335",
    ),
    Method(
        "bends",
        "flexibility k = 1.65/h, h = T R / r^2, less under pressure",
        "ASME B31.3, Appendix D",
    ),
    Method("sag, loads", "K u = weight, every unknown stiffness at its median", "linear statics"),
)
MATCH = (
    Method(
        "doubt of each unknown",
        "prior: supports by kind, "
        f"an unknown one within a factor of {math.exp(UNKNOWN_SD_LN):.1f}, one standard deviation; "
        "posterior: members of the ensemble by the likelihood of all measured frequencies, each "
        f"with its own ± and {MODEL_ERROR:.1%} of the model",
        "annealed importance resampling: Neal 2001; Del Moral, Doucet and Jasra 2006 (from memory)",
    ),
    Method(
        "which peak is which mode",
        "not assumed: summed over every order-preserving alignment, missed modes and false peaks "
        "allowed",
        "Durbin, Eddy, Krogh and Mitchison 1998, chapter 4 (from memory)",
    ),
    Method(
        "effective members",
        "how many independent draws the ensemble is worth, from its family tree",
        "Lee and Whiteley 2018, Biometrika 105, 609 (from memory)",
    ),
)
DETUNE = (
    Method(
        "chance",
        "share of the ensemble in which no mode lies in a band, in the running state, each member "
        f"with its own scatter of installation ({STIFFNESS_SCATTER_LN:.0%} in stiffness, "
        f"{1000 * PLACE_SCATTER_M:.0f} mm in place: common practice, no source); counted by the "
        "inertia of the receptance at the band edges",
        "Haynsworth 1968, Linear Algebra and its Applications 1, 73",
    ),
    Method(
        "modes after",
        "from about ten modes and attachment vectors for each member; the central member from a "
        "model built anew",
        "Craig 1981; MacNeal 1971 (from memory)",
    ),
    Method(
        "bands",
        "an excitation [low, high] widened to [low (1 - margin), high (1 + margin)]",
        "separation margins: API 618, 5th edition, as secondary texts give them",
    ),
    Method("amplification", order_response.HOW, "Thomson, Theory of Vibration with Applications"),
    Method("effort", "1 is about one bracket welded to nearby steel", "common practice, no source"),
)
METHODS: Mapping[str, Sequence[Method]] = {
    "tap": TAP,
    "running": RUNNING,
    "span": SPAN,
    "match": MATCH,
    "detune": DETUNE,
    "sheet": (),
}


def how(view: str, work: Workup | None = None) -> list[str]:
    """What stands behind the numbers of a view, those of a job's handbook estimate filled in."""
    methods = METHODS[view] or [one for group in METHODS.values() for one in group]
    lines = [line for one in methods for line in (f"{one.number}: {one.how}", _source(one), "")]
    if view == "span" and work is not None:
        lines += _handbook(work)
    return lines[:-1] if lines and not lines[-1] else lines


def _source(one: Method) -> str:
    return f"  source: {one.source}"


def _handbook(work: Workup) -> Iterable[str]:
    for entry in work.states:
        yield f"as {entry.state}:"
        yield from handbook_words(entry)
        yield ""


def document(view: str) -> list[dict[str, str]]:
    """The same for other programs."""
    return [{"number": m.number, "how": m.how, "source": m.source} for m in METHODS[view]]
