import numpy as np
import pytest

from calc.sag import critical_point, predict
from calc.stretches import cut
from tests.calc.integration import TOLERANCE, integrate, random_river

RIVERS = 300
CHUNK = 50


def _places(river, seed):
    features = [feature.distance_km for feature in (*river.inflows, *river.weirs)]
    bounds = [*(reach.from_km for reach in river.reaches), river.to_km]
    return np.sort([*np.random.default_rng(seed).uniform(river.from_km, river.to_km, 30), *features, *bounds])


@pytest.mark.parametrize("first", range(0, RIVERS, CHUNK))
def test_prediction_agrees_with_integration_in_random_rivers(first):
    for seed in range(first, first + CHUNK):
        river = random_river(seed)
        distance_km = _places(river, seed)
        do, cbod, nbod = integrate(river, distance_km, **TOLERANCE)
        profile = predict(river, distance_km)
        assert profile.do_mg_l == pytest.approx(do, abs=1e-8), seed
        assert profile.cbod_mg_l == pytest.approx(cbod, abs=1e-8), seed
        assert profile.nbod_mg_l == pytest.approx(nbod, abs=1e-8), seed


def test_random_rivers_hold_what_is_awkward():
    rivers = [random_river(seed) for seed in range(RIVERS)]
    stretches = [cut(river) for river in rivers]
    long = [part.to_km - part.from_km > 0.1 for part in stretches]
    balances = [part.balance for part in stretches]
    assert sum((np.isclose(b.ka_per_day, b.kr_per_day, rtol=1e-9)).any() for b in balances) > 20
    assert sum((b.ka_per_day < b.kd_per_day).any() for b in balances) > 20
    assert sum((b.net_mg_l_per_day < 0).any() for b in balances) > 20
    assert sum((b.deficit_mg_l < 0).any() for b in balances) > 20
    for phase in (1, 2):
        assert sum(((part.phase == phase) & far).any() for part, far in zip(stretches, long, strict=True)) > 10
    settling = [(b.ks_per_day > 0) & (part.phase == 1) for b, part in zip(balances, stretches, strict=True)]
    assert sum(found.any() for found in settling) > 5
    named = [caution.name for part in stretches for caution in part.cautions]
    assert named.count("supersaturated above a weir") > 5
    assert named.count("oxygen runs out") > 20
    kinds = {critical_point(river).kind for river in rivers}
    assert len(kinds) >= 5
