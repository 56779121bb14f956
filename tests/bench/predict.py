"""Time a predicted sag against integrating the same balance with DOP853: python -m tests.bench.predict"""

from dataclasses import replace
from time import perf_counter

import numpy as np
from scipy.integrate import solve_ivp

from calc.river import Inflow, Reach, River, Thetas, Water
from calc.sag import critical_point, predict

POINTS = 1000


def timed_ms(function, repeats):
    """Return the median time of a call. [ms]"""
    times = []
    for _ in range(repeats):
        start = perf_counter()
        function()
        times.append(perf_counter() - start)
    return 1e3 * float(np.median(times))


def ten_reaches():
    """Return a river of ten reaches with an outfall; rates hold as given, so that both sides do the same work."""
    reaches = tuple(
        Reach(
            6.0 * place,
            6.0 * place + 6.0,
            0.20 + 0.02 * place,
            1.0 + 0.1 * place,
            0.5,
            1.0 + 0.1 * place,
            ks20_per_day=0.1,
            kn20_per_day=0.2,
            respiration_mg_l_per_day=0.3,
        )
        for place in range(10)
    )
    outfall = Inflow(0.0, Water(0.5, 3.0, 22.0, 60.0, 15.0), kind="outfall")
    return River(Water(4.0, 8.5, 20.0, 2.0, 0.5), reaches, (outfall,), thetas=Thetas(1.0, 1.0, 1.0, 1.0, 1.0))


def integrated(river, distance_km):
    """Return oxygen at the distances, reach by reach with DOP853 to 1e-8 at the same points."""
    mixed = predict(river, 0.0)
    saturation = float(mixed.saturation_mg_l)
    y = np.array([mixed.deficit_mg_l, mixed.cbod_mg_l, mixed.nbod_mg_l])
    parts = []
    for reach in river.reaches:
        kd, ka, ks, kn = reach.kd20_per_day, reach.ka20_per_day, reach.ks20_per_day, reach.kn20_per_day
        net, speed = reach.respiration_mg_l_per_day, 86.4 * reach.velocity_m_s

        def balance(_, y, kd=kd, ka=ka, ks=ks, kn=kn, net=net):
            deficit, cbod, nbod = y
            return kd * cbod + kn * nbod + net - ka * deficit, -(kd + ks) * cbod, -kn * nbod

        inside = (distance_km >= reach.from_km) & (distance_km < reach.to_km)
        end_d = (reach.to_km - reach.from_km) / speed
        times = np.append((distance_km[inside] - reach.from_km) / speed, end_d)
        run = solve_ivp(balance, (0.0, end_d), y, method="DOP853", rtol=1e-8, atol=1e-8, t_eval=times)
        parts.append(saturation - run.y[0, :-1])
        y = run.y[:, -1]
    return np.concatenate(parts)


def plausible(river, n):
    """Return n rivers around one: five reaches, rates and velocity varied."""
    rng = np.random.default_rng(1)
    kd, ka, speed = rng.lognormal(0, 0.3, (3, n))
    reaches = tuple(
        replace(
            reach,
            kd20_per_day=reach.kd20_per_day * kd,
            ka20_per_day=reach.ka20_per_day * ka,
            velocity_m_s=reach.velocity_m_s * speed,
        )
        for reach in river.reaches[:5]
    )
    return replace(river, reaches=reaches)


def main():
    """Print the times and ratios; the goals are 2 ms and 100 times faster."""
    river = ten_reaches()
    distance_km = np.linspace(0, 60, POINTS, endpoint=False)
    difference = np.abs(predict(river, distance_km).do_mg_l - integrated(river, distance_km)).max()
    ours = timed_ms(lambda: predict(river, distance_km), 300)
    theirs = timed_ms(lambda: integrated(river, distance_km), 20)
    print(f"predict, 10 reaches, {POINTS} points: {ours:.3f} ms")
    print(
        f"DOP853 to 1e-8, same points: {theirs:.1f} ms, {theirs / ours:.0f} times as long, differs by {difference:.1e}"
    )
    print(f"critical point, 10 reaches: {timed_ms(lambda: critical_point(river), 100):.2f} ms")
    rivers, stations_km = plausible(river, 400), np.linspace(0, 29, 40)
    ours = timed_ms(lambda: predict(rivers, stations_km), 50)
    one = timed_ms(lambda: integrated(replace(river, reaches=river.reaches[:5]), stations_km), 20)
    print(f"predict, 400 rivers of 5 reaches, 40 points: {ours:.1f} ms")
    print(f"DOP853 for one such river: {one:.2f} ms, for 400 {400 * one / ours:.0f} times as long")
    print(f"critical points of 400 rivers: {timed_ms(lambda: critical_point(rivers), 50):.1f} ms")


if __name__ == "__main__":
    main()
