"""Second blows told by the modes: a decay that was struck twice is not free from its start.

Once all taps together have given the poles, a second blow of the same hammer at the same place is
a copy of the first response, so much weaker and so much later: two numbers a tap that explain what
free decay leaves. The generalised likelihood ratio of the two, over delays and strengths, sees
blows that no short stretch of the recording shows (Kay 1998, Fundamentals of Statistical Signal
Processing: Detection Theory, chapter 6).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.heard_taps import Heard, Record, heard_of, poles_of, whitened, whitener
from fieldkit.signal.normal_equations import Sums, real_columns, sums
from fieldkit.signal.restrikes import LONGEST_GAP_S
from fieldkit.signal.traces import Component

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_SHORTEST_GAP_S = 0.0075
_DELAYS = 48
_BEST = 3
_ABOUT = 0.07
_PER_PERIOD = 8.0
_MOST_SHARE = 1.3
_SHARES = np.array([0.15, 0.22, 0.33, 0.5, 0.75, 1.1])
_SURE_CONTACT_S = 0.009
"""A free decay that begins later may begin after a second blow: it is looked at from sooner on."""
_CONTACTS_S = (0.001, 0.003, 0.006, 0.009)
_LATER_CONTACT_S = 0.0025
_LEAST_BETWEEN_S = 0.0025
_LEAST_BETWEEN = 4
_LEARN_S = 0.15
_WORTH_A_LOOK = 25.0
"""Twice the log-likelihood that free decay lacks."""
_SURE = 80.0
_SURE_SOON = 150.0
_SAME_SHAPE = 0.8
_EXPLAINED = 0.6
_SOON_S = 0.016
"""Until then it may be the end of a long contact, which the same hammer makes at every tap."""
_SOON_OVER_OTHERS = 4.0


@dataclass(frozen=True)
class SecondBlow:
    """A second blow while the first still rings."""

    after_s: float
    """Time after the first."""
    share: float
    """Of the first one's strength."""
    likelihood: float
    """Twice the logarithm of the likelihood ratio to free decay alone."""


@dataclass(frozen=True)
class Split:
    """A tap before and after a supposed second blow."""

    delay_s: float
    early: Sums
    late: Sums

    @cached_property
    def after(self) -> float:
        """Sum of squares that the best decay leaves after it."""
        return float(self.late.rest)

    @cached_property
    def free(self) -> float:
        """Sum of squares before it that one decay through it leaves."""
        return float((self.early + self.late).rest) - self.after

    @cached_property
    def alone(self) -> float:
        """Sum of squares before it that a decay of its own leaves."""
        return float(self.early.rest)

    @property
    def apart(self) -> float:
        """What a decay of its own explains more than one decay through it."""
        return self.free - self.alone

    def lacks(self, noise: float) -> float:
        """What one decay through it leaves over the noise."""
        return self.free - self.early.count * noise

    def unexplained(self, noise: float) -> float:
        """What two decays apart leave over the noise."""
        return self.alone + self.after - (self.early.count + self.late.count) * noise

    def hides_more(self, noise: float) -> bool:
        """Whether two decays apart explain well what one leaves."""
        lacks = self.lacks(noise)
        return lacks > _WORTH_A_LOOK * noise and self.apart > max(
            _EXPLAINED * lacks, _WORTH_A_LOOK * noise
        )


def second_blows(
    records: Sequence[Record], parts: Sequence[Component], top_hz: float
) -> list[SecondBlow | None]:
    """For each tap the second blow that its free decay hides; None where there is none.

    ``parts`` are all modes and tones up to ``top_hz``. Raises nothing: a tap too short to say
    anything says nothing.
    """
    if not len(poles_of(parts, 0)):
        return [None for _ in records]
    heard = [heard_of(r, tap, parts, top_hz) for tap, r in enumerate(records)]
    weights = whitener([h.left[h.after(h.free_s)][: int(_LEARN_S * h.rate_hz)] for h in heard if h])
    ready = [whitened(h, weights) if h else None for h in heard]
    found = [most_likely(h, contacts_s(h.free_s)) if h else None for h in ready]
    return [
        one if one and not (one.after_s < _SOON_S and long_contact(k, one, ready)) else None
        for k, one in enumerate(found)
    ]


def long_contact(tap: int, one: SecondBlow, taps: Sequence[Heard | None]) -> bool:
    """True for what the contacts of the other taps show as well, or where there is no other."""
    others = [h for k, h in enumerate(taps) if h and k != tap]
    alike = [likeliest(h, _CONTACTS_S, _SOON_S) for h in others]
    usual = [found.likelihood if found else 0.0 for found in alike]
    return not usual or one.likelihood < _SOON_OVER_OTHERS * float(np.median(usual))


def most_likely(heard: Heard, contacts: Sequence[float]) -> SecondBlow | None:
    """The most likely second blow of a tap, if there surely is one."""
    best = likeliest(heard, contacts, LONGEST_GAP_S)
    return best if best and best.likelihood > needed(best.after_s) else None


def likeliest(heard: Heard, contacts: Sequence[float], longest_s: float) -> SecondBlow | None:
    """The most likely second blow after any of some contacts, sure or not."""
    noise = heard.noise
    delays_s = np.geomspace(_SHORTEST_GAP_S, LONGEST_GAP_S, _DELAYS)
    delays_s = delays_s[delays_s <= longest_s]
    found = [
        refined(heard, contact_s, delays_s, noise)
        for contact_s in contacts
        if suspicious(heard, contact_s, noise)
    ]
    return max((f for f in found if f), key=lambda f: f.likelihood, default=None)


def needed(after_s: float) -> float:
    """Likelihood from which on a second blow is sure; soon after the first less is known."""
    return _SURE_SOON if after_s < _SOON_S else _SURE


def refined(heard: Heard, contact_s: float, delays_s: Real, noise: float) -> SecondBlow | None:
    """The most likely second blow near the delays at which two decays apart fit best."""
    coarse = [one for one in splits(heard, contact_s, delays_s) if one.hides_more(noise)]
    coarse.sort(key=lambda one: one.unexplained(noise))
    best: SecondBlow | None = None
    for middle_s in (one.delay_s for one in coarse[:_BEST]):
        fine = splits(heard, contact_s, near(middle_s, heard.highest_hz))
        for one in fine:
            told = copied(one, _SHARES, heard.poles, noise)
            if told and (best is None or told.likelihood > best.likelihood):
                best, split = told, one
    if best is None:
        return None
    shares = best.share * np.linspace(0.75, 1.33, 7)
    shares = shares[(shares >= _SHARES[0]) & (shares < _MOST_SHARE)]
    return copied(split, shares, heard.poles, noise) or best


def near(middle_s: float, highest_hz: float) -> Real:
    """Delays about one of the coarse ones, close enough for the highest mode."""
    count = int(2 * _ABOUT * middle_s * highest_hz * _PER_PERIOD) + 1
    return middle_s * np.linspace(1 - _ABOUT, 1 + _ABOUT, min(max(count, 9), 61))


def contacts_s(free_s: float) -> tuple[float, ...]:
    """Ends of the first contact to try, from the blow on."""
    if free_s < _SURE_CONTACT_S:
        return (free_s, free_s + 0.002)
    return (*_CONTACTS_S, free_s)


def suspicious(heard: Heard, contact_s: float, noise: float) -> bool:
    """True where more than noise is left of the first part of a decay."""
    first = heard.after(contact_s + heard.smear_s).start
    part = heard.left[first : heard.after(LONGEST_GAP_S).start]
    count = np.arange(1, len(part) + 1)
    excess = np.cumsum(part**2) / noise - count
    return bool(np.any(excess > _WORTH_A_LOOK + np.sqrt(2 * count)))


def splits(heard: Heard, contact_s: float, delays_s: Real) -> list[Split]:
    """A tap before and after each of some delays, of those that leave enough on both sides."""
    columns, samples, blur_s = real_columns(heard.decays), heard.samples, heard.smear_s
    first = int(np.searchsorted(heard.time_s, contact_s + blur_s))
    lasts = np.searchsorted(heard.time_s, delays_s - blur_s)
    agains = np.searchsorted(heard.time_s, delays_s + _LATER_CONTACT_S + blur_s)
    enough = (lasts - first >= max(_LEAST_BETWEEN, _LEAST_BETWEEN_S * heard.rate_hz)) & (
        len(samples) - agains >= columns.shape[1] + 12
    )
    if not np.any(enough):
        return []
    delays_s, lasts, agains = delays_s[enough], lasts[enough], agains[enough]

    def between(start: int, past: int) -> Sums:
        return sums(columns[start:past], samples[start:past])

    early, late = between(first, lasts[0]), between(agains[0], len(samples))
    found = [Split(float(delays_s[0]), early, late)]
    for k in range(1, len(delays_s)):
        early = early + between(lasts[k - 1], lasts[k])
        late = late - between(agains[k - 1], agains[k])
        found.append(Split(float(delays_s[k]), early, late))
    return found


def copied(split: Split, shares: Real, poles: Complex, noise: float) -> SecondBlow | None:
    """The best strength of a second blow at one delay; None where it explains too little."""
    if not split.hides_more(noise):
        return None
    echoes: Complex = np.exp(-poles * split.delay_s)
    factors = np.reciprocal(1 + np.outer(shares, echoes))
    left = (split.early.turned(factors) + split.late).rest - split.after
    best = int(np.argmin(left))
    gained = split.free - float(left[best])
    if gained < _SAME_SHAPE * split.apart or gained < _EXPLAINED * split.lacks(noise):
        return None
    variance = max(noise, float(left[best]) / split.early.count)
    return SecondBlow(split.delay_s, float(shares[best]), gained / variance)
