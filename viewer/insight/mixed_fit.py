"""Measured shapes as a mixture of analysis modes, found so that wrong channels neither spoil it nor hide in it.

A structure that differs a little from its model has the model's modes, each mixed with a little of the others: to the
first order in the difference, mode p takes up of mode j a share of the size ε·√(λp λj) / |λp − λj| (Rayleigh, The
Theory of Sound, 2nd ed. 1894, § 90, of small changes of a system; from memory). That is what is assumed
beforehand about the mixture: its own analysis mode at any size, of every other mode a share of about that size. So a
channel that alone carries a mode is still contradicted by the others, and no reading can be explained by a mode that
has no business there.

Which channels to believe is found by least trimmed squares from many starts, each from half of the points
(Rousseeuw P.J., Van Driessen K., Computing LTS regression for large data sets, Data Min. Knowl. Discov. 12 (2006)
29; from memory); then those that the others predict are taken in until nothing changes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.stats import chi2

from viewer.insight.correlate import mac, modal_scale_factor
from viewer.model.arrays import Array

MIXING = 0.1  # ε: how far stiffness and mass may be off, as a share
MOST = 1.0  # of a mode's own size, the share that another may have whose frequency is next to it
LEAST = 0.01  # and the share that any may have
KNOWN = 0.25  # MAC below which a measured mode has no analysis mode of its own
EXACT = 0.005  # of a mode's rms: no reading is taken to be better than that
STARTS = 24
SETTLED = 5  # of the starts are carried to their end
KEPT = 0.7  # share of the channels that the best start is judged by
DOUBT = 2e-5  # chance that a right channel would be set aside if readings were normal
SLACK = 1.6  # times what that chance allows, since a model's errors are no noise


@dataclass(frozen=True, eq=False)
class Mixture:
    """A fit of c channels in m measured modes by k analysis modes.

    phi           (k, c) analysis modes at the channels
    inverse       (m, k, k) covariance of each measured mode's coefficients
    weights       (c,) 1 for channels that the fit believes, 0 for those that it does not use
    coefficients  (m, k)
    spread        (m,) standard deviation of a right reading about the fit
    """

    phi: Array
    inverse: Array
    weights: Array
    coefficients: Array
    spread: Array

    def without(self, y: Array, channels: Array) -> tuple[Array, Array]:
        """(m, n) what the other channels say about n channels that are not believed together, and the variance (m, n)
        of a right reading about that."""
        part, weight = self.phi[:, channels], self.weights[channels]
        predicted = self.coefficients @ part
        gained = np.einsum("ka,mkl,lb->mab", part, self.inverse, part)
        used = weight > 0
        if used.any():
            take = np.eye(len(channels))[used]
            core = np.einsum("ua,mab,vb->muv", take, gained, take)
            core = self.spread[:, None, None] ** 2 * np.eye(int(used.sum())) - core
            cross = np.einsum("mab,ub->mau", gained, take)
            solved = np.linalg.solve(core, np.swapaxes(cross, 1, 2))  # (m, u, n)
            residual = (y[:, channels] - predicted)[:, used]
            predicted = predicted - np.einsum("mun,mu->mn", solved, residual)
            gained = gained + cross @ solved
        variance = self.spread[:, None] ** 2 + np.einsum("maa->ma", gained)
        return predicted, variance

    def surprise(self, y: Array) -> Array:
        """(c,) mean square over the modes of how far each reading lies from what the others say, in standard
        deviations: about 1 for a right channel."""
        reach = np.einsum("kc,mkl,lc->mc", self.phi, self.inverse, self.phi)
        square = self.spread[:, None] ** 2
        share = np.where(self.weights > 0, reach / square, 0.0)
        residual = (y - self.coefficients @ self.phi) / (1 - share)
        variance = square + np.where(self.weights > 0, reach / (1 - share), reach)
        return (np.abs(residual) ** 2 / variance).mean(axis=0)

    def cost(self, y: Array, allowed: Array) -> float:
        """−2 ln of the likelihood of the readings (but for a constant): those believed are normal about the fit, the
        others could be anything of the size of the mode, rms 1."""
        far = np.minimum(self.surprise(y), 2 * bound(len(y)))
        believed = self.weights > 0
        tight = 2 * np.log(self.spread).sum()
        return float(len(y) * far[believed].sum() + believed.sum() * tight + len(y) * (allowed & ~believed).sum())

    def reach(self, rows: Array) -> Array:
        """(m, n) variance of a right reading at n places whose analysis modes are ``rows`` (k, n)."""
        return self.spread[:, None] ** 2 + np.einsum("kn,mkl,ln->mn", rows, self.inverse, rows)


def bound(modes: int) -> float:
    """Mean square surprise over ``modes`` modes above which a channel is not believed."""
    return float(SLACK * chi2.isf(DOUBT, modes) / modes)


def own_modes(y: Array, phi: Array) -> Array:
    """(m,) index of the analysis mode that each measured mode is nearest to, −1 where it is near none; one may be the
    nearest to several."""
    likeness = mac(y, phi)
    best = likeness.argmax(axis=1)
    return np.where(likeness[np.arange(len(y)), best] >= KNOWN, best, -1)


def expected_sizes(y: Array, phi: Array, freq_hz: Array, own: Array) -> Array:
    """(m, k) size that each coefficient may have: of the mode's own analysis mode any, of others see above."""
    square = np.asarray(freq_hz, float) ** 2
    out = np.empty((len(y), len(phi)))
    for i, p in enumerate(own):
        if p < 0:  # nothing is known: any mode up to the size of the reading
            out[i] = np.sqrt((np.abs(y[i]) ** 2).sum() / np.maximum((phi**2).sum(axis=1), 1e-300))
            continue
        gap = np.abs(square - square[p])
        share = np.divide(MIXING * np.sqrt(square * square[p]), gap, out=np.full(len(gap), np.inf), where=gap > 0)
        size = abs(modal_scale_factor(y[i], phi[p]))
        out[i] = size * np.clip(share, LEAST, MOST)
        out[i, p] = 1e3 * size
    return out


def fit(y: Array, phi: Array, sizes: Array, weights: Array, spread: Array) -> Mixture:
    """Of readings y (m, c) with the channels' weights (c,), coefficients expected about 0 with ``sizes`` (m, k)."""
    weighed = phi * weights
    normal = (weighed @ phi.T)[None] / spread[:, None, None] ** 2
    normal = normal + np.eye(len(phi)) / np.maximum(sizes, 1e-300)[:, :, None] ** 2
    # scaled to a unit diagonal, since sizes differ by orders
    scale = 1 / np.sqrt(np.einsum("mkk->mk", normal))
    inverse = np.linalg.inv(normal * scale[:, :, None] * scale[:, None, :]) * scale[:, :, None] * scale[:, None, :]
    pull = (y @ weighed.T) / spread[:, None] ** 2
    return Mixture(phi, inverse, weights, np.einsum("mkl,ml->mk", inverse, pull), spread)


def robust_fit(
    y: Array, phi: Array, sizes: Array, points: Array, allowed: Array, known: Mixture | None = None
) -> Mixture:
    """The fit that explains the readings best. ``points`` (c,) the point of each channel, ``allowed`` (c,) bool,
    ``known`` a fit to start from too."""
    rng = np.random.default_rng(0)  # fixed: the same test gives the same answer
    labels = np.unique(points[allowed])
    rough = np.sqrt((np.abs(y[:, allowed]) ** 2).mean(axis=1))
    drafts: dict[bytes, tuple[float, Array, Array]] = {}
    for start in range(STARTS):
        chosen = labels if start == 0 else rng.permutation(labels)[: max((len(labels) + 1) // 2, 1)]
        weights = (allowed & np.isin(points, chosen)).astype(float)
        weights, spread = _concentrated(y, phi, sizes, weights, 0.2 * rough, allowed)
        drafts[weights.tobytes()] = (float(np.log(spread).sum()), weights, spread)
    best = sorted(drafts.values(), key=lambda draft: draft[0])[:SETTLED]
    starts = [(weights, spread) for _, weights, spread in best]
    if known is not None:
        starts.append((np.where(allowed, known.weights, 0.0), known.spread))
    fits = [settled(y, phi, sizes, weights, spread, allowed) for weights, spread in starts]
    return min(fits, key=lambda found: found.cost(y, allowed))


def _concentrated(
    y: Array, phi: Array, sizes: Array, weights: Array, spread: Array, allowed: Array
) -> tuple[Array, Array]:
    """Channels (c,) and spread (m,) after a few steps that each keep the channels nearest to the fit."""
    kept = max(int(np.ceil(KEPT * allowed.sum())), 1)
    floor = EXACT * np.sqrt((np.abs(y[:, allowed]) ** 2).mean(axis=1))
    for _ in range(8):
        residual = np.abs(y - fit(y, phi, sizes, weights, spread).coefficients @ phi) ** 2
        far = np.where(allowed, (residual / spread[:, None] ** 2).mean(axis=0), np.inf)
        took = np.argsort(far, kind="stable")[:kept]
        spread = np.sqrt(residual[:, took].mean(axis=1)) + floor
        again = np.zeros(len(far))
        again[took] = 1.0
        if np.array_equal(again, weights):
            break
        weights = again
    return weights, spread


def settled(y: Array, phi: Array, sizes: Array, weights: Array, spread: Array, allowed: Array) -> Mixture:
    """From a first choice of channels: take in all that the others predict, until nothing changes."""
    limit, modes = bound(len(y)), len(y)
    middle = chi2.median(modes) / modes
    floor = EXACT * np.sqrt((np.abs(y[:, allowed]) ** 2).mean(axis=1))
    mixture = fit(y, phi, sizes, weights, spread)
    far = mixture.surprise(y)[allowed]
    spread = np.maximum(spread * np.sqrt(np.median(far) / middle), floor)
    for _ in range(20):
        mixture = fit(y, phi, sizes, weights, spread)
        again = (allowed & (mixture.surprise(y) <= limit)).astype(float)
        spread = _spread(y, fit(y, phi, sizes, again, spread), floor)
        if np.array_equal(again, weights):
            break
        weights = again
    return fit(y, phi, sizes, weights, spread)


def _spread(y: Array, mixture: Mixture, floor: Array) -> Array:
    """(m,) standard deviation about the fit of the channels believed, degrees of freedom taken off."""
    weights, square = mixture.weights, mixture.spread[:, None] ** 2
    reach = np.einsum("kc,mkl,lc->mc", mixture.phi, mixture.inverse, mixture.phi) / square
    residual = np.abs(y - mixture.coefficients @ mixture.phi) ** 2
    free = weights.sum() - (weights * reach).sum(axis=1)
    return np.maximum(np.sqrt((weights * residual).sum(axis=1) / np.maximum(free, 1.0)), floor)
