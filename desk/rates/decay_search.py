"""The search for the parameters of a Nelson-Siegel or Svensson curve nearest to bonds.

Parameters are the level β₀, the short rate β₀ + β₁, the curvatures β₂ (and β₃) and then the logarithms of
the decays τ, one row a start: all starts of a search move at the same time.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.decay_bounds import SearchBounds
from desk.rates.decay_grid import least_squares, lowest_of_three
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.small_products import small_product

__all__ = ["Found", "nearest"]

FloatArray = NDArray[np.float64]

_LEAST_NOISE = 1e-4  # of a yield, where there is no bond more than parameters [1/year]
_LARGEST_EXPONENT = 50.0
_NODES = 64
_LANDSCAPES = 2
_STARTS = 12
_ROUNDS = 3
_BETTER = 0.999  # of the sum of squares: with less gained, another round is not worth its while
# Steps, and how many of the starts go on after them.
_HEATS = ((8, 6), (25, 3), (80, 3))
_FINALISTS, _FINE_STEPS, _MORE_STEPS = 2, 15, 200
_MORE_WORK = 2_000_000  # payments valued
_AT_REST = 1e-6  # of the sum of squares: less than that is not to be gained
_NOTHING = 1e-26  # a sum of squares of rates that is rounding
_LEAST_DAMPING, _MOST_DAMPING = 1e-11, 1e6


@dataclass(frozen=True, eq=False)
class Found:
    """Where the search ended.

    Attributes
    ----------
    numbers : ndarray, shape (2 + 2 · humps,)
        The rates [1/year] and then the decays themselves [years].
    cost : float
        The sum of squares, those of the bounds' rows with it [1/year²].
    converged : bool
        Whether it came to rest.
    evaluations : int
        How often the bonds were valued in its last part.
    """

    numbers: FloatArray
    cost: float
    converged: bool
    evaluations: int


def nearest(flows: QuotedFlows, yields: FloatArray, humps: int) -> Found:
    """The parameters at which the sum of squares is least, see `desk.rates.fitting.fit_svensson`.

    Parameters
    ----------
    flows : QuotedFlows
    yields : ndarray, shape (m,)
        Continuous [1/year].
    humps : int
        1 for Nelson-Siegel, 2 for Svensson.
    """
    # With absurd prices numbers may overflow; what comes of it is never better than anything else.
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        return _searched(flows, yields, humps)


def _searched(flows: QuotedFlows, yields: FloatArray, humps: int) -> Found:
    worth = flows.amount * np.exp(-yields[flows.instrument] * flows.time)
    scale = flows.sums(worth * flows.time)  # price times duration
    bounds = SearchBounds.of(flows, yields, humps)
    rough, fine = _Thinned(flows, scale, bounds), _Whole(flows, scale, bounds)
    starts = rough.landscape(yields[:, None])
    for _ in range(_LANDSCAPES - 1):
        rough.note_noise(starts)
        starts = _joined(rough.landscape(rough.zero(starts[:1])), starts, humps)
    begun = starts
    tried = np.empty((0, starts.shape[1]))
    best_cost = np.inf
    for _ in range(_ROUNDS):
        for steps, kept in _HEATS:
            moved = _descended(rough, starts, steps)
            starts = _distinct(moved.numbers, moved.cost)[:kept]
        tried = np.concatenate((tried, moved.numbers))
        costs = rough.costs(tried)
        lowest = int(costs.argmin())
        gained = costs[lowest] < _BETTER * best_cost
        rough.note_noise(tried[lowest : lowest + 1])
        costs = rough.costs(tried)
        best_cost = float(costs[lowest])
        if not gained or best_cost <= _NOTHING:
            break
        further = _joined(begun, rough.landscape(rough.zero(tried[lowest : lowest + 1])), humps)
        starts, begun = further[len(begun) :], further
        if not len(starts):
            break
    fine.note_noise(tried[lowest : lowest + 1])
    moved = _descended(fine, _distinct(tried, costs)[:_FINALISTS], _FINE_STEPS)
    lowest = int(moved.cost.argmin())
    for _ in range(_ROUNDS):
        former = fine.weight
        fine.note_noise(moved.numbers[lowest : lowest + 1])
        if fine.weight > 0.5 * former:
            break
        # Bonds on a curve of the family: what held their ends gives way, step by step.
        moved, lowest = _descended(fine, moved.numbers[lowest : lowest + 1], _FINE_STEPS), 0
    if not moved.at_rest[lowest]:
        # Along the floor of a narrow valley, as far as there is time for.
        steps = min(max(_MORE_WORK // flows.instrument.size, _FINE_STEPS), _MORE_STEPS)
        moved, lowest = _descended(fine, moved.numbers[lowest : lowest + 1], steps), 0
    numbers = moved.numbers[lowest].copy()
    numbers[1] -= numbers[0]
    numbers[2 + humps :] = np.exp(numbers[2 + humps :])
    return Found(numbers, float(moved.cost[lowest]), bool(moved.at_rest[lowest]), moved.evaluations)


def _joined(first: FloatArray, second: FloatArray, humps: int) -> FloatArray:
    """The first points, and those of the second with other decays."""
    near = np.abs(second[:, None, -humps:] - first[None, :, -humps:]).max(axis=2) < 1e-9
    return np.concatenate((first, second[~near.any(axis=1)]))


def _distinct(tried: FloatArray, costs: FloatArray) -> FloatArray:
    """The lowest few of the points, leaving out those at the same sum of squares."""
    order = np.argsort(costs, kind="stable")
    is_new = np.diff(costs[order], prepend=-np.inf) > 1e-6 * costs[order]
    is_new[0] = True
    return tried[order[is_new]]


class _Errors(ABC):
    """Errors of yield and their slopes, for many sets of parameters at a time.

    Attributes
    ----------
    time : ndarray, shape (n + w,)
        Of the payments, and those of the bounds.
    weight : float
        The noise of the bonds: what a difference of the bounds' rows weighs beside an error of yield.
    """

    time: FloatArray

    def __init__(self, bounds: SearchBounds, count: int) -> None:
        self.bounds, self.humps, self.rates = bounds, bounds.humps, 2 + bounds.humps
        self.low, self.high = bounds.low, bounds.high
        self.count = count
        self.weight = _LEAST_NOISE

    def note_noise(self, numbers: FloatArray) -> None:
        """Take the noise from the least errors of some sets of parameters, shape (s, parameters)."""
        squares = float(_sum_of_squares(self.at(numbers)[0][:, : self.count]).min())
        if np.isfinite(squares):
            free = self.count - self.low.size
            # Few errors may be small by chance; that many are small is no chance.
            self.weight = float(np.sqrt((squares + _LEAST_NOISE**2 * 10.0**-free) / max(free, 1)))

    def costs(self, numbers: FloatArray) -> FloatArray:
        """The sums of squares that the search makes least, by start."""
        return _sum_of_squares(self.at(numbers)[0])

    def shapes(self, numbers: FloatArray) -> FloatArray:
        """Derivatives of zero rates by the parameters; dimensions: start, parameter, time."""
        decays = np.exp(numbers[:, self.rates :])
        ratio = self.time / decays[:, :, None]
        left = np.exp(-ratio)
        tilt = -np.expm1(-ratio) / ratio
        hump = tilt - left
        # By ln τ, x = t/τ: the slope's loading moves by the curvature's, and that by itself less x e^{-x}.
        bend = numbers[:, 2 : self.rates, None] * (hump - ratio * left)
        bend[:, 0] += (numbers[:, 1] - numbers[:, 0])[:, None] * hump[:, 0]
        found = np.empty((len(numbers), self.rates + self.humps, self.time.size))
        found[:, 0] = 1.0 - tilt[:, 0]
        found[:, 1] = tilt[:, 0]
        found[:, 2 : self.rates] = hump
        found[:, self.rates :] = bend
        return found

    def zero(self, numbers: FloatArray) -> FloatArray:
        """Zero rates at the payments; dimensions: start, time."""
        shapes = self.shapes(numbers)[:, : self.rates, : -self.bounds.times.size]
        return np.asarray(np.einsum("sk,skt->st", numbers[:, : self.rates], shapes))

    def at(self, numbers: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Errors [1/year] and their slopes.

        Returns
        -------
        errors : ndarray; dimensions: start, bond and then row of the bounds
        slopes : ndarray; dimensions: start, parameter, bond and then row of the bounds
        """
        shapes = self.shapes(numbers)
        zero = np.einsum("sk,skt->st", numbers[:, : self.rates], shapes[:, : self.rates])
        paid = self.time.size - self.bounds.times.size
        rows = self.weight * self.bounds.rows
        about, about_slope = zero[:, paid:] @ rows, shapes[:, :, paid:] @ rows
        time, shapes = self.time[:paid], shapes[:, :, :paid]
        # Bounded, so that a stray step meets large errors and not infinite ones.
        factor = np.exp(np.minimum(-zero[:, :paid] * time, _LARGEST_EXPONENT))
        shapes = shapes * (-time * factor)[:, None, :]
        return (
            np.concatenate((self.errors(factor), about), axis=-1),
            np.concatenate((self.sums(shapes), about_slope), axis=-1),
        )

    @abstractmethod
    def errors(self, factor: FloatArray) -> FloatArray:
        """Errors at discount factors."""

    @abstractmethod
    def sums(self, per_time: FloatArray) -> FloatArray:
        """Sums over the payments of each bond, by the scale of the bond; dimensions as given."""


class _Whole(_Errors):
    """Of the bonds as they are."""

    def __init__(self, flows: QuotedFlows, scale: FloatArray, bounds: SearchBounds) -> None:
        super().__init__(bounds, len(flows))
        paid, self._time_of = np.unique(flows.time, return_inverse=True)
        self.time = np.concatenate((paid, bounds.times))
        self._flows, self._scale = flows, scale
        # Many instruments pay on the same days: then a product of matrices is less work than sums of rows.
        self._weights: FloatArray | None = None
        if len(flows) * paid.size <= 8 * flows.time.size:
            self._weights = np.zeros((paid.size, len(flows)))
            np.add.at(self._weights, (self._time_of, flows.instrument), flows.amount)
            self._weights /= scale

    def errors(self, factor: FloatArray) -> FloatArray:
        return self.sums(factor) - self._flows.target / self._scale

    def sums(self, per_time: FloatArray) -> FloatArray:
        if self._weights is not None:
            return np.asarray(per_time @ self._weights)
        per_flow = np.take(per_time, self._time_of, axis=-1)
        per_flow *= self._flows.amount
        return np.asarray(np.add.reduceat(per_flow, self._flows.first_row, axis=-1) / self._scale)


class _Thinned(_Errors):
    """Of bonds with each last payment as it is and the others shared out among a few times.

    A payment goes to the four times about it in such parts that cubic polynomials of time are summed right.
    """

    def __init__(self, flows: QuotedFlows, scale: FloatArray, bounds: SearchBounds) -> None:
        super().__init__(bounds, len(flows))
        count = self.count
        last = np.append(flows.first_row[1:], flows.instrument.size) - 1
        others = np.ones(flows.instrument.size, dtype=np.bool_)
        others[last] = False
        time, amount, own = flows.time[others], flows.amount[others], flows.instrument[others]
        self._weights = np.zeros((count, 0))
        nodes = np.zeros(0)
        if time.size:
            nodes, weights = _shared_out(time, amount, own, count)
            self._weights = weights / scale[:, None]
        self.time = np.concatenate((flows.time[last], nodes, bounds.times))
        self._own = flows.amount[last] / scale
        self._target = flows.target / scale

    def errors(self, factor: FloatArray) -> FloatArray:
        return self.sums(factor) - self._target

    def sums(self, per_time: FloatArray) -> FloatArray:
        count = self.count
        return np.asarray(per_time[..., :count] * self._own + per_time[..., count:] @ self._weights.T)

    def landscape(self, known: FloatArray) -> FloatArray:
        """The lowest points of a grid of decays, with the rates solved for to first order about known ones.

        Parameters
        ----------
        known : ndarray, shape (m, 1) or (1, times)
            A rate for each bond, or zero rates.

        Returns
        -------
        ndarray, shape (s, parameters)
            The lowest first.
        """
        count, time = self.count, self.time[: -self.bounds.times.size]
        if known.shape[0] == 1:
            own_zero, zero = known[0, :count], known[:, count:]
        else:
            own_zero, zero = known[:, 0], known
        own = self._own * np.exp(np.minimum(-own_zero * time[:count], _LARGEST_EXPONENT))
        shared = self._weights * np.exp(np.minimum(-zero * time[count:], _LARGEST_EXPONENT))
        worth = own + shared.sum(axis=1)
        # What a zero rate at each time weighs in the error, to first order.
        own_weight, weight = own * time[:count], shared * time[count:]
        goal = own_weight * own_zero + (weight * zero).sum(axis=1) + worth - self._target
        decays = self.bounds.decays
        ratio = self.time / decays[:, None]
        left = np.exp(-ratio)
        tilt = -np.expm1(-ratio) / ratio
        loadings = np.concatenate((1.0 - tilt, tilt, tilt - left))
        # dimensions: levels, short rates and curvatures of all decays, goal; bond, row of the bounds
        columns = np.zeros((len(loadings) + 1, count + self.bounds.rows.shape[1]))
        columns[:-1, :count] = loadings[:, :count] * own_weight
        columns[:-1, :count] += small_product(loadings[:, count : time.size], weight.T)
        columns[:-1, count:] = loadings[:, time.size :] @ (self.weight * self.bounds.rows)
        columns[-1, :count] = goal
        products = small_product(columns, columns.T)

        size = decays.size
        each = np.arange(size)
        first = each if self.humps == 1 else each[:, None]
        picks = [first, size + first, 2 * size + first]
        if self.humps == 2:
            picks.append(2 * size + each[None, :])
        cost, rates = least_squares(products, picks)
        for number, low, high in zip(rates, self.low, self.high, strict=False):
            cost[(number < low) | (number > high)] = np.inf
        if self.humps == 2:
            np.fill_diagonal(cost, np.inf)
        beside = cost
        for axis in range(self.humps):
            beside = lowest_of_three(beside, axis)
        is_low = np.flatnonzero(np.isfinite(cost) & (cost == beside))
        is_low = is_low[np.argsort(cost.ravel()[is_low], kind="stable")][:_STARTS]
        if not is_low.size:
            return self._middle()
        places = np.stack(np.unravel_index(is_low, cost.shape), axis=1)
        return np.concatenate((rates.reshape(self.rates, -1)[:, is_low].T, np.log(decays)[places]), axis=1)

    def _middle(self) -> FloatArray:
        """One start for quotes so far from each other that no rates within bounds fit any decays."""
        start = np.zeros((1, self.rates + self.humps))
        start[0, :2] = 0.5 * (self.low[:2] + self.high[:2])
        start[0, self.rates :] = np.linspace(self.low[-1], self.high[-1], 4)[1 : 1 + self.humps]
        return start


def _sum_of_squares(miss: FloatArray) -> FloatArray:
    """By start; infinite where an error is not a number."""
    total = np.sum(miss**2, axis=1)
    return np.where(np.isnan(total), np.inf, total)


def _shared_out(
    time: FloatArray, amount: FloatArray, own: NDArray[np.int64], count: int
) -> tuple[FloatArray, FloatArray]:
    """A few times, and what each bond pays at each of them, shape (count, times)."""
    # Closer where the time is short and curves bend.
    nodes = np.geomspace(0.5, 0.5 + max(float(time.max()), 0.1), _NODES) - 0.5
    first = np.clip(np.searchsorted(nodes, time) - 2, 0, _NODES - 4)
    flat = np.zeros(count * _NODES)
    for j in range(4):
        part = amount.copy()
        for k in range(4):
            if k != j:
                part *= (time - nodes[first + k]) / (nodes[first + j] - nodes[first + k])
        flat += np.bincount(own * _NODES + first + j, part, count * _NODES)
    # The first node is at time 0, where nothing is discounted and no rate counts.
    nodes[0] = 1e-9
    return nodes, flat.reshape(count, _NODES)


@dataclass(frozen=True, eq=False)
class _Moved:
    numbers: FloatArray
    cost: FloatArray
    at_rest: NDArray[np.bool_]
    evaluations: int


def _descended(errors: _Errors, starts: FloatArray, most_steps: int) -> _Moved:
    """All starts towards the nearest least sum of squares.

    Levenberg and Marquardt's method (Marquardt, D.W. (1963), An algorithm for least-squares estimation of
    nonlinear parameters, J. SIAM 11(2)) within bounds; a parameter at its bound stays while it would leave.
    """
    count = starts.shape[1]
    low, high = errors.low, errors.high
    numbers = np.clip(starts, low, high)
    miss, slope = errors.at(numbers)
    cost = _sum_of_squares(miss)
    damping = np.full(len(numbers), 1e-4)
    at_rest = cost <= _NOTHING
    diagonal = range(count)
    evaluations = 1
    for _ in range(most_steps):
        live = np.flatnonzero(~at_rest & (damping < _MOST_DAMPING))
        if not live.size:
            break
        here, slopes = numbers[live], slope[live]
        side = np.einsum("skm,sm->sk", slopes, miss[live])
        held = ((here <= low) & (side > 0.0)) | ((here >= high) & (side < 0.0))
        matrix = slopes @ slopes.transpose(0, 2, 1)
        size = np.sqrt(matrix[:, diagonal, diagonal])
        size[held | (size == 0.0)] = 1.0
        side = np.where(held, 0.0, side / size)
        matrix /= size[:, :, None] * size[:, None, :]
        free = ~held
        matrix *= free[:, :, None] & free[:, None, :]
        matrix[:, diagonal, diagonal] = 1.0 + damping[live, None]
        step = np.linalg.solve(matrix, -side[:, :, None])[:, :, 0]
        # What the step gains to first order of the errors: -(2 gᵀs + sᵀ(A - damping)s) = sᵀ(damping s - g).
        promised = np.einsum("sk,sk->s", step, damping[live, None] * step - side)
        ahead = np.clip(here + step / size, low, high)
        ahead_miss, ahead_slope = errors.at(ahead)
        evaluations += 1
        ahead_cost = _sum_of_squares(ahead_miss)
        before = cost[live]
        better = ahead_cost < before
        rows = live[better]
        numbers[rows], miss[rows], slope[rows] = ahead[better], ahead_miss[better], ahead_slope[better]
        cost[rows] = ahead_cost[better]
        # Less where the errors fell as promised, more where they did not.
        ratio = (before - ahead_cost) / np.maximum(promised, 1e-300)
        factor = np.where(ratio > 0.75, 0.1, np.where(ratio > 0.25, 0.7, np.where(better, 2.0, 5.0)))
        damping[live] = np.maximum(damping[live] * factor, _LEAST_DAMPING)
        at_rest[live] = (promised <= _AT_REST * before) & (better | (damping[live] < 1e-6)) | (
            cost[live] <= _NOTHING
        )
    return _Moved(numbers, cost, at_rest, evaluations)
