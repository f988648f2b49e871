"""The full equations of a fiber, written from the physics page and not from the program, for scipy's stiff integrators.

Plain floats and scipy alone: nothing of the program is imported, so that it can be wrong only in its own way.
"""

import math
from dataclasses import dataclass

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

R = 287.05
T = 293.15
RHO0, T0 = 1.185, 293.15
MU = 18.206e-6


def contractile_volume(e, L0, r0, a0, k):
    """V(e) of a braid: pi r² L with its changes from rest divided by k."""
    lam = 1.0 - k * e
    sin_a = np.sqrt(1.0 - (lam * math.cos(a0)) ** 2)
    free = math.pi * (r0 * sin_a / math.sin(a0)) ** 2 * L0 * lam
    rest = math.pi * r0**2 * L0
    return rest + (free - rest) / k


def contractile_energy(e, L0, r0, wall, G, a0, k):
    """W(e) of a neo-Hookean tube of constant volume in a braid."""
    l1 = 1.0 - k * e
    l2 = np.sqrt(1.0 - (l1 * math.cos(a0)) ** 2) / math.sin(a0)
    l3 = 1.0 / (l1 * l2)
    Vw = math.pi * (r0**2 - (r0 - wall) ** 2) * L0
    return Vw * G / 2.0 * (l1**2 + l2**2 + l3**2 - 3.0) / k


def extensile_volume(e, L0, r0):
    return math.pi * r0**2 * L0 * (1.0 + e)


def extensile_energy(e, L0, r0, wall, G):
    stretch = 1.0 + e
    Vw = math.pi * (r0**2 - (r0 - wall) ** 2) * L0
    return Vw * G / 2.0 * (stretch**2 + stretch**-2 - 2.0)


@dataclass
class Fiber:
    """One fiber as mounted, in SI; `volume` and `energy` are functions of strain."""

    volume: object
    energy: object
    wall_volume: float
    L0: float
    stop: float
    load: float = 0.0
    friction: float = 0.0
    settle: float = 0.0
    C: float = 5e-11
    b: float = 0.3
    bore: float = 2e-3
    length: float = 0.8
    own_bore: float = 2e-3
    count: int = 1
    parallel: int = 1
    n: float = 1.2
    ambient: float = 101325.0

    def __post_init__(self):
        self.e = np.linspace(0.0, self.stop * (1.0 - 1e-6), 40001)
        h = self.e[1] / 2.0
        slope_V = (self.volume(self.e[1:-1] + h) - self.volume(self.e[1:-1] - h)) / (2.0 * h)
        slope_W = (self.energy(self.e[1:-1] + h) - self.energy(self.e[1:-1] - h)) / (2.0 * h)
        self.dV = np.interp(self.e, self.e[1:-1], slope_V)
        extend = lambda y: np.concatenate([[2 * y[0] - y[1]], y, [2 * y[-1] - y[-2]]])  # noqa: E731
        self.dV, dW = extend(slope_V), extend(slope_W)
        self.balance = (dW + self.load * self.L0) / self.dV

    def holds(self, way):
        """Pressures along the strains that hold them on the way in ("in") or out."""
        return self.balance / (1.0 - self.friction if way == "in" else 1.0 + self.friction)

    def strain(self, P, way):
        return float(np.interp(P, self.holds(way), self.e))

    def gas(self, e):
        return self.count * (float(self.volume(e)) - self.wall_volume) + math.pi / 4.0 * self.bore**2 * self.length


def valve_flow(C, b, p1, p2):
    """ISO 6358, with a straight line over the last thousandth."""
    if p1 <= p2:
        return 0.0
    x = p2 / p1
    share = lambda x: math.sqrt(max(0.0, 1.0 - ((x - b) / (1.0 - b)) ** 2))  # noqa: E731
    factor = 1.0 if x <= b else share(x) if x < 0.999 else share(0.999) * (1.0 - x) / 0.001
    return C * p1 * RHO0 * math.sqrt(T0 / T) * factor


def tube_inlet(bore, length, flow, p2):
    """Inlet pressure of isothermal flow with friction: laminar, or Blasius above Re 3000, one bore."""
    if flow <= 0.0:
        return p2
    A = math.pi / 4.0 * bore**2
    re = 4.0 * flow / (math.pi * bore * MU)
    f = 64.0 / re if re < 3000.0 else 0.3164 * re**-0.25
    flux2 = (flow / A) ** 2 * R * T
    p1 = math.sqrt(p2**2 + flux2 * f * length / bore)
    for _ in range(8):
        p1 = math.sqrt(p2**2 + flux2 * (f * length / bore + 2.0 * math.log(p1 / p2)))
    return p1


def way_flow(fiber, p_from, p_to, filling):
    """Mass flow through valve, tube and half the fiber's own bore, the valve first when filling and last when exhausting."""
    if p_from <= p_to:
        return 0.0
    tubes = [(fiber.bore, fiber.length, 1), (fiber.own_bore, fiber.L0 / 2.0 * fiber.count / fiber.parallel, fiber.parallel)]

    def excess(middle):
        flow = valve_flow(fiber.C, fiber.b, p_from, middle) if filling else valve_flow(fiber.C, fiber.b, middle, p_to)
        p = p_to if filling else middle
        for bore, length, parallel in reversed(tubes) if filling else tubes:
            p = tube_inlet(bore, length, flow / parallel, p)
        return p - middle if filling else p - p_from

    middle = brentq(excess, p_to, p_from, xtol=1e-6, rtol=1e-14)
    return valve_flow(fiber.C, fiber.b, p_from, middle) if filling else valve_flow(fiber.C, fiber.b, middle, p_to)


def journey(fiber, P0, e0, goal, supply, times, strain0=None):
    """Gauge pressure, strain after friction, strain after lag at `times` for a valve open until the pressure is `goal`.

    Integrates dP/dt = n (R T m' - P V' de/dt) / V and settle ds/dt = e - s with LSODA; de/dt = e'(P) dP/dt where the fiber
    is at the edge of its friction band, else 0.
    """
    filling = goal > P0
    holds = fiber.holds("in" if filling else "out")

    def strain(P):
        e = float(np.interp(P, holds, fiber.e))
        return max(e0, e) if filling else min(e0, e)

    def rates(t, y):
        P, s = y
        e = strain(P)
        edge = float(np.interp(P, holds, fiber.e))
        moving = (edge > e0 if filling else edge < e0) and holds[0] < P < holds[-1]
        V = fiber.gas(e)
        if moving:
            at = int(np.clip(np.searchsorted(fiber.e, e), 1, len(fiber.e) - 1))
            slope = (holds[at] - holds[at - 1]) / (fiber.e[at] - fiber.e[at - 1])
            swell = fiber.count * np.interp(e, fiber.e, fiber.dV) / slope
        else:
            swell = 0.0
        p = P + fiber.ambient
        if filling:
            flow = way_flow(fiber, supply + fiber.ambient, p, True) if goal > P else 0.0
        else:
            flow = -way_flow(fiber, p, fiber.ambient, False) if goal < P else 0.0
        dP = fiber.n * R * T * flow / (V + fiber.n * p * swell)
        return [dP, (e - s) / fiber.settle if fiber.settle else 0.0]

    # An open exhaust never quite reaches the outside: a pascal short of the goal has arrived.
    arrives = lambda t, y: abs(y[0] - goal) - 1.0  # noqa: E731
    arrives.terminal = True
    s0 = e0 if strain0 is None else strain0
    options = {"method": "LSODA", "rtol": 1e-6, "atol": [1.0, 1e-7], "max_step": 0.01}
    first = solve_ivp(rates, (times[0], times[-1]), [P0, s0], events=arrives, dense_output=True, **options)
    end = first.t[-1]
    P = np.where(times <= end, first.sol(np.minimum(times, end))[0], goal if first.status == 1 else first.y[0, -1])
    e = np.array([strain(each) for each in P])
    if not fiber.settle:
        return P, e, e
    s = first.sol(np.minimum(times, end))[1]
    rest = e[-1] + (first.y[1, -1] - e[-1]) * np.exp(-np.maximum(times - end, 0.0) / fiber.settle)
    return P, e, np.where(times <= end, s, rest)
